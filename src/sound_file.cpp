#include "src/sound_file.h"

#include <fcntl.h>
#include <sys/stat.h>

#include <algorithm>
#include <cerrno>
#include <cmath>

#include "dsp/error.h"
#include "src/missing_sound.h"
#include "src/number_text.h"
#include "src/system_text.h"

namespace unsoldered {
namespace {

constexpr int kMaxChannels = 8;
constexpr int kMinRateHz = 8000;
constexpr int kMaxRateHz = 384000;
const std::string kTakes = "WAV, FLAC, AIFF or W64";
constexpr double kAbsurdSample = 1e6;  // +120 dB over full scale: a broken file, not a recording

/// A take may also be the built-in phrase.
std::string or_built_in(const std::string& kind) { return kind == "take" ? ", or the word built-in" : ""; }

FileHandle open_for_reading(const std::filesystem::path& path, const std::string& kind) {
  // Not blocking: opening a pipe nobody writes to would hang.
  FileHandle file(::open(path.c_str(), O_RDONLY | O_CLOEXEC | O_NONBLOCK | O_NOCTTY));
  if (file.get() < 0) {
    const int error = errno;
    const std::string text = kind + " '" + path.string() + "': " + system_text(error);
    if (error == ENOENT || error == ENOTDIR || error == ELOOP || error == ENAMETOOLONG) {
      throw InputError(text + "; give a " + kTakes + " file" + or_built_in(kind));
    }
    throw CannotError(text + (error == EACCES ? "; check the permissions of the file and its folder" : ""));
  }
  struct stat about {};
  if (::fstat(file.get(), &about) != 0) throw CannotError(kind + " '" + path.string() + "': " + system_text(errno));
  if (S_ISDIR(about.st_mode)) {
    throw InputError(kind + " '" + path.string() + "': is a folder; give a " + kTakes + " file in it");
  }
  if (!S_ISREG(about.st_mode)) {
    throw InputError(kind + " '" + path.string() +
                     "': is not a regular file, and it may have to be read more than once; save it to a file first");
  }
  return file;
}

/// Of the container or of the coding, whichever part of a format code is given.
std::string format_name(int format) {
  SF_FORMAT_INFO info{};
  info.format = format;
  if (sf_command(nullptr, SFC_GET_FORMAT_INFO, &info, sizeof info) != 0 || info.name == nullptr) return "other";
  return info.name;
}

/// Containers whose header may promise more than there is without libsndfile saying so.
bool is_plain(int format) {
  switch (format & SF_FORMAT_TYPEMASK) {
    case SF_FORMAT_WAV:
    case SF_FORMAT_WAVEX:
    case SF_FORMAT_RF64:
    case SF_FORMAT_W64:
    case SF_FORMAT_AIFF:
      return true;
    default:
      return false;
  }
}

bool is_accepted(int format) {
  if ((format & SF_FORMAT_TYPEMASK) == SF_FORMAT_FLAC) return true;
  if (!is_plain(format)) return false;
  switch (format & SF_FORMAT_SUBMASK) {
    case SF_FORMAT_PCM_S8:
    case SF_FORMAT_PCM_U8:
    case SF_FORMAT_PCM_16:
    case SF_FORMAT_PCM_24:
    case SF_FORMAT_PCM_32:
    case SF_FORMAT_FLOAT:
    case SF_FORMAT_DOUBLE:
    case SF_FORMAT_ULAW:
    case SF_FORMAT_ALAW:
      return true;
    default:
      return false;
  }
}

bool is_floating(int format) {
  const int sub = format & SF_FORMAT_SUBMASK;
  return sub == SF_FORMAT_FLOAT || sub == SF_FORMAT_DOUBLE;
}

std::string range_text(int low, int high, const char* unit) {
  return std::to_string(low) + " to " + std::to_string(high) + unit;
}

}  // namespace

SoundFileTake::SoundFileTake(const std::filesystem::path& path, const std::string& kind)
    : path_(path), kind_(kind), descriptor_(open_for_reading(path, kind)) {
  const std::string where = kind_ + " '" + path_.string() + "': ";
  const auto missing = missing_sound_bytes(descriptor_.get());
  SF_INFO info{};
  sound_.reset(sf_open_fd(descriptor_.get(), SFM_READ, &info, SF_FALSE));
  if (!sound_) {
    throw InputError(where + "not a sound file that can be read: " + sf_strerror(nullptr) + " Give a " + kTakes +
                     " file" + or_built_in(kind));
  }
  if (!is_accepted(info.format)) {
    const std::string coding =
        is_plain(info.format) ? ", coded as \"" + format_name(info.format & SF_FORMAT_SUBMASK) + "\", which is unusual"
                              : "";
    throw InputError(where + "is a file of the kind \"" + format_name(info.format & SF_FORMAT_TYPEMASK) + "\"" +
                     coding + "; a take is WAV, AIFF or W64 (8 to 32 bits or float) or FLAC, so convert it first");
  }
  if (info.channels < 1 || info.channels > kMaxChannels) {
    throw InputError(where + std::to_string(info.channels) + " channels; accepted are " +
                     range_text(1, kMaxChannels, " channels") + ", so mix it down or split it first");
  }
  if (info.samplerate < kMinRateHz || info.samplerate > kMaxRateHz) {
    throw InputError(where + "sample rate " + std::to_string(info.samplerate) + " Hz; accepted are " +
                     range_text(kMinRateHz, kMaxRateHz, " Hz") + ", so resample it first");
  }
  // A FLAC stream whose length was not known when it was written says 0, which libsndfile reports as the largest count.
  const bool unknown = info.frames == SF_COUNT_MAX || info.frames < 0;
  if (info.frames == 0)
    throw InputError(where + "holds no sound (0 samples); give " + (kind_ == "take" ? "a take" : "one") +
                     " with something in it");
  format_ = {info.samplerate, info.channels, unknown ? 0 : info.frames};
  floating_ = is_floating(info.format);
  if (missing) {
    warning_ = where + "is cut short: the header promises " + std::to_string(*missing) +
               " bytes of sound more than there are; using the " +
               format_number(static_cast<double>(info.frames) / info.samplerate) + " s that are there";
  }
}

int SoundFileTake::read(double* interleaved, int frames) {
  const auto count = static_cast<int>(sf_readf_double(sound_.get(), interleaved, frames));
  frames_read_ += count;
  if (count < frames) {
    const bool failed = sf_error(sound_.get()) != SF_ERR_NO_ERROR;
    if (failed || frames_read_ < format_.frames) {
      throw InputError(kind_ + " '" + path_.string() + "': damaged or cut short: it can be read up to sample " +
                       std::to_string(frames_read_) +
                       (format_.frames > 0 ? " of " + std::to_string(format_.frames) : "") +
                       (failed ? std::string(" (") + sf_strerror(sound_.get()) + ")" : "") +
                       "; get a whole copy, or save the good part as a file of its own");
    }
    if (frames_read_ == 0) {
      throw InputError(kind_ + " '" + path_.string() + "': holds no sound (0 samples); give " +
                       (kind_ == "take" ? "a take" : "one") + " with something in it");
    }
  }
  if (floating_) check_samples(interleaved, count);
  return count;
}

void SoundFileTake::check_samples(const double* interleaved, int frames) const {
  const int count = frames * format_.channels;
  const auto is_good = [](double sample) { return std::abs(sample) <= kAbsurdSample; };  // false for NaN
  bool good = true;
  for (int i = 0; i < count; ++i) good &= is_good(interleaved[i]);  // no early way out: the compiler makes it wide
  if (good) return;
  const auto index = std::find_if_not(interleaved, interleaved + count, is_good) - interleaved;
  const std::int64_t frame = frames_read_ - frames + index / format_.channels;
  throw InputError(kind_ + " '" + path_.string() + "': sample " + std::to_string(frame) + " (at " +
                   format_number(static_cast<double>(frame) / format_.rate_hz) + " s) of channel " +
                   std::to_string(index % format_.channels + 1) + " is " + format_number(interleaved[index]) +
                   "; full scale is 1 and anything finite up to " + format_number(kAbsurdSample) +
                   " is accepted, so repair or export the take again");
}

}  // namespace unsoldered
