#include "src/replace_file.h"

#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cerrno>
#include <cstdio>
#include <cstdlib>
#include <string>
#include <system_error>

#include "dsp/error.h"
#include "src/file_handle.h"
#include "src/system_text.h"

namespace unsoldered {
namespace {

constexpr mode_t kUsualMode = 0666;  // less what the user's mask takes away

mode_t mode_for(const std::string& target) {
  struct stat status {};
  if (::stat(target.c_str(), &status) == 0) return status.st_mode & 07777;
  const mode_t mask = ::umask(0);  // the only way to ask for it is to set it
  ::umask(mask);
  return kUsualMode & ~mask;
}

bool write_all(int descriptor, std::string_view text) {
  while (!text.empty()) {
    const ssize_t written = ::write(descriptor, text.data(), text.size());
    if (written < 0 && errno == EINTR) continue;
    if (written < 0) return false;
    text.remove_prefix(static_cast<std::size_t>(written));
  }
  return ::fsync(descriptor) == 0;
}

}  // namespace

void replace_file(const std::filesystem::path& file, std::string_view text) {
  const auto refuse = [&](int error) {
    throw CannotError(file.string() + ": cannot be written: " + system_text(error) + "; " + write_advice(error));
  };
  std::error_code error;
  const std::filesystem::path real = std::filesystem::weakly_canonical(file, error);
  const std::string target = error ? file.string() : real.string();
  std::string temporary = target + ".XXXXXX";
  FileHandle handle(::mkstemp(temporary.data()));
  if (handle.get() < 0) refuse(errno);
  if (!write_all(handle.get(), text) || ::fchmod(handle.get(), mode_for(target)) != 0 || !handle.close() ||
      std::rename(temporary.c_str(), target.c_str()) != 0) {
    const int why = errno;
    ::unlink(temporary.c_str());
    refuse(why);
  }
}

}  // namespace unsoldered
