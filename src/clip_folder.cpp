#include "src/clip_folder.h"

#include <fcntl.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <cstdio>
#include <random>
#include <set>
#include <system_error>
#include <utility>

#include "dsp/error.h"
#include "src/file_handle.h"
#include "src/system_text.h"

namespace unsoldered {
namespace {

namespace fs = std::filesystem;

constexpr std::size_t kLongestName = 255;  // bytes; NAME_MAX of every usual file system

/// Renames without ever replacing; returns 0 or errno.
int rename_to_new(const fs::path& from, const fs::path& to) {
  if (::renameat2(AT_FDCWD, from.c_str(), AT_FDCWD, to.c_str(), RENAME_NOREPLACE) == 0) return 0;
  if (errno != EINVAL && errno != ENOSYS) return errno;
  // A file system without that flag: a second link refuses an existing name as well.
  if (::link(from.c_str(), to.c_str()) != 0) return errno;
  ::unlink(from.c_str());
  return 0;
}

std::string random_token() {
  std::random_device random;
  return std::to_string(random()) + std::to_string(random());
}

std::string in_quotes(const fs::path& path) { return "'" + path.string() + "'"; }

/// Status 2 when the name itself is wrong, 3 when the system does not grant it.
[[noreturn]] void refuse_folder(const fs::path& folder, const std::error_code& error) {
  const std::string text = "--out " + in_quotes(folder) + ": cannot make the folder: " + error.message();
  if (error == std::errc::filename_too_long) throw InputError(text + "; give a shorter name");
  if (error == std::errc::not_a_directory) {
    throw InputError(text + " (a part of this path is a file); give another folder");
  }
  throw CannotError(text + "; " + write_advice(error.value()));
}

}  // namespace

ClipFolder::ClipFolder(fs::path folder, std::vector<std::string> names, bool force, const std::vector<fs::path>& inputs)
    : folder_(std::move(folder)), names_(std::move(names)), force_(force), token_(random_token()) {
  check(inputs);
}

void ClipFolder::check(const std::vector<fs::path>& inputs) const {
  if (folder_.empty()) throw InputError("--out: the name is empty; give a folder for the clips, it may be a new one");
  std::set<std::string> seen;
  for (const std::string& name : names_) {
    if (name.size() > kLongestName) {
      throw InputError("--out: the file name " + in_quotes(name) + " would be " + std::to_string(name.size()) +
                       " bytes long; at most " + std::to_string(kLongestName) +
                       " are accepted, so shorten the name of the take or of the hookup file");
    }
    if (!seen.insert(name).second) {
      throw InputError("--out: two clips would be called " + in_quotes(name) +
                       "; give each hookup file a name of its own and each dial position (two decimals) once");
    }
  }
  std::error_code error;
  const auto about = fs::status(folder_, error);
  if (error && about.type() == fs::file_type::none) {
    refuse_folder(folder_, error);
  }
  if (!fs::exists(about)) return;
  if (!fs::is_directory(about)) {
    throw InputError("--out " + in_quotes(folder_) + ": is a file; give a folder for the clips, it may be a new one");
  }
  std::string existing;
  for (const std::string& name : names_) {
    const fs::path target = folder_ / name;
    const auto target_about = fs::symlink_status(target, error);
    if (!fs::exists(target_about)) continue;
    for (const fs::path& input : inputs) {
      if (fs::equivalent(target, input, error)) {
        throw InputError("--out " + in_quotes(folder_) + ": " + in_quotes(name) + " there is the input " +
                         in_quotes(input) + " itself, which is never overwritten; give another folder");
      }
    }
    if (fs::is_directory(target_about)) {
      throw InputError("--out " + in_quotes(folder_) + ": " + in_quotes(name) +
                       " there is a folder; give another folder");
    }
    existing += (existing.empty() ? "" : ", ") + name;
  }
  if (!existing.empty() && !force_) {
    throw InputError("--out " + in_quotes(folder_) + ": already there: " + existing +
                     "; give another folder, or --force to replace them");
  }
}

void ClipFolder::create() {
  std::vector<fs::path> missing;  // innermost first
  for (fs::path at = fs::absolute(folder_).lexically_normal(); !at.empty(); at = at.parent_path()) {
    if (!at.has_filename() && at != at.root_path()) continue;  // "clips/": a trailing slash is an empty name
    std::error_code error;
    if (fs::exists(at, error) || error || at == at.root_path()) break;
    missing.push_back(at);
  }
  std::reverse(missing.begin(), missing.end());
  for (const fs::path& at : missing) {
    std::error_code error;
    if (fs::create_directory(at, error)) created_.push_back(at);
    if (error) refuse_folder(folder_, error);
  }
}

fs::path ClipFolder::temporary(std::size_t index) const {
  return folder_ / (".unsoldered-" + token_ + "-" + std::to_string(index) + ".part");
}

void ClipFolder::discard(std::size_t index) const noexcept { ::unlink(temporary(index).c_str()); }

void ClipFolder::write(std::size_t index, const std::string& text) const {
  const auto fail = [&](int error) {
    throw CannotError("cannot write " + in_quotes(folder_ / names_[index]) + ": " + system_text(error) + "; " +
                      write_advice(error));
  };
  FileHandle file(::open(temporary(index).c_str(), O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0666));
  if (file.get() < 0) fail(errno);
  for (std::size_t done = 0; done < text.size();) {
    const ssize_t count = ::write(file.get(), text.data() + done, text.size() - done);
    if (count < 0 && errno == EINTR) continue;
    if (count < 0) fail(errno);
    done += static_cast<std::size_t>(count);
  }
  if (!file.close()) fail(errno);
}

void ClipFolder::publish() {
  std::size_t done = 0;
  try {
    for (; done < names_.size(); ++done) publish(done);
  } catch (...) {
    // Only what certainly was not there before may be taken back.
    if (!force_) {
      while (done-- > 0) ::unlink((folder_ / names_[done]).c_str());
    }
    throw;
  }
  published_ = true;
}

void ClipFolder::publish(std::size_t index) const {
  const fs::path target = folder_ / names_[index];
  const fs::path from = temporary(index);
  const int error = force_ ? (std::rename(from.c_str(), target.c_str()) == 0 ? 0 : errno) : rename_to_new(from, target);
  if (error == EEXIST) {
    throw InputError(in_quotes(target) + " has appeared meanwhile; give another folder, or --force to replace it");
  }
  if (error != 0) {
    throw CannotError("cannot write " + in_quotes(target) + ": " + system_text(error) + "; " + write_advice(error));
  }
}

ClipFolder::~ClipFolder() {
  if (published_) return;
  for (std::size_t index = 0; index < names_.size(); ++index) discard(index);
  for (auto folder = created_.rbegin(); folder != created_.rend(); ++folder) ::rmdir(folder->c_str());
}

}  // namespace unsoldered
