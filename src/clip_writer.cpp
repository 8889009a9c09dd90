#include "src/clip_writer.h"

#include <fcntl.h>

#include <algorithm>
#include <cerrno>
#include <cmath>
#include <cstdlib>
#include <limits>
#include <utility>

#include "dsp/error.h"
#include "src/number_text.h"
#include "src/system_text.h"

namespace unsoldered {
namespace {

constexpr double kPlainWavBytes = 4.29e9;  // a little under 2^32, where the RIFF sizes end

int bytes_of(Depth depth) { return depth == Depth::pcm16 ? 2 : depth == Depth::pcm24 ? 3 : 4; }

int sound_format(const TakeFormat& format, Depth depth) {
  const double bytes = static_cast<double>(format.frames) * format.channels * bytes_of(depth);
  // Plain WAV where it is legal: everything reads it. More than two channels want the extensible header.
  const int container = format.frames == 0 || bytes > kPlainWavBytes ? SF_FORMAT_RF64
                        : format.channels > 2                        ? SF_FORMAT_WAVEX
                                                                     : SF_FORMAT_WAV;
  const int coding = depth == Depth::pcm16   ? SF_FORMAT_PCM_16
                     : depth == Depth::pcm24 ? SF_FORMAT_PCM_24
                                             : SF_FORMAT_FLOAT;
  return container | coding;
}

/// Nearest integer to a value well inside +-2^51, halves to even: adding 1.5 * 2^52 leaves no room for a fraction.
/// The compiler vectorises this, which it does not do with lrint. Needs the usual rounding mode.
double nearest(double value) noexcept {
  constexpr double kShift = 0x1.8p52;
  return (value + kShift) - kShift;
}

/// Little-endian samples of Width bytes, `stride` bytes apart.
template <int Width>
void pack(const std::vector<std::int32_t>& samples, unsigned char* to, std::size_t stride) noexcept {
  for (const std::int32_t sample : samples) {
    for (int byte = 0; byte < Width; ++byte) to[byte] = static_cast<unsigned char>(sample >> (8 * byte));
    to += stride;
  }
}

}  // namespace

Depth parse_depth(const std::string& text, const std::string& where) {
  if (text == "16") return Depth::pcm16;
  if (text == "24") return Depth::pcm24;
  if (text == "float") return Depth::float32;
  throw InputError(where + ": \"" + text + "\" is not a depth; give 16, 24 or float");
}

ClipWriter::ClipWriter(const std::filesystem::path& path, std::string name, TakeFormat format, Depth depth)
    : name_(std::move(name)),
      folder_(path.parent_path()),
      descriptor_(::open(path.c_str(), O_RDWR | O_CREAT | O_EXCL | O_CLOEXEC, 0666)),
      channels_(format.channels),
      depth_(depth) {
  if (descriptor_.get() < 0) failed_in_system(errno);
  for (int channel = 0; channel < channels_; ++channel) {
    dither_.emplace_back(dither_seed(name_ + '/' + std::to_string(channel)));
  }
  SF_INFO info{};
  info.samplerate = format.rate_hz;
  info.channels = format.channels;
  info.format = sound_format(format, depth);
  sound_.reset(sf_open_fd(descriptor_.get(), SFM_WRITE, &info, SF_FALSE));
  if (!sound_) failed(std::string("because ") + sf_strerror(nullptr));
  sf_command(sound_.get(), SFC_SET_CLIPPING, nullptr, SF_TRUE);
  sf_command(sound_.get(), SFC_SET_ADD_PEAK_CHUNK, nullptr, SF_FALSE);
  if ((info.format & SF_FORMAT_TYPEMASK) == SF_FORMAT_RF64) {
    sf_command(sound_.get(), SFC_RF64_AUTO_DOWNGRADE, nullptr, SF_TRUE);
  }
}

void ClipWriter::write(const double* const* channels, int frames, double gain) {
  if (depth_ == Depth::float32) {
    write_floats(channels, frames, gain);
  } else {
    write_integers(channels, frames, gain);
  }
  frames_written_ += frames;
}

void ClipWriter::write_integers(const double* const* channels, int frames, double gain) {
  const auto width = static_cast<std::size_t>(bytes_of(depth_));
  const auto count = static_cast<std::size_t>(channels_);
  const double scale = depth_ == Depth::pcm16 ? 0x1p15 : 0x1p23;
  bytes_.resize(static_cast<std::size_t>(frames) * count * width);

  whole_.resize(static_cast<std::size_t>(frames));
  bool finite = true;
  std::int32_t most = 0;
  for (std::size_t channel = 0; channel < count; ++channel) {
    finite &= quantise(channels[channel], gain * scale, scale, channel);
    for (const std::int32_t whole : whole_) most = std::max(most, std::abs(whole));
    unsigned char* to = bytes_.data() + channel * width;
    if (depth_ == Depth::pcm16) {
      pack<2>(whole_, to, count * width);
    } else {
      pack<3>(whole_, to, count * width);
    }
  }
  if (!finite) refuse(channels, frames, gain);
  peak_ = std::max(peak_, most / scale);
  const auto size = static_cast<sf_count_t>(bytes_.size());
  errno = 0;
  if (sf_write_raw(sound_.get(), bytes_.data(), size) != size) failed_in_system(errno);
}

bool ClipWriter::quantise(const double* from, double factor, double scale, std::size_t channel) noexcept {
  // Loops without branches and without early ways out: the compiler makes them wide. NaN becomes -scale, and false.
  const auto clipped = [scale](double value) { return std::min(scale - 1, std::max(-scale, value)); };
  bool finite = true;
  if (depth_ == Depth::pcm16) {
    for (std::size_t i = 0; i < whole_.size(); ++i) {
      const double value = from[i] * factor;
      finite &= std::abs(value) <= std::numeric_limits<double>::max();
      // Digital silence has no rounding error to hide and stays silent.
      const double dithered = value + (value == 0 ? 0 : dither_[channel].next());
      whole_[i] = static_cast<std::int32_t>(clipped(nearest(dithered)));
    }
  } else {
    for (std::size_t i = 0; i < whole_.size(); ++i) {
      const double value = from[i] * factor;
      finite &= std::abs(value) <= std::numeric_limits<double>::max();
      whole_[i] = static_cast<std::int32_t>(clipped(nearest(value)));
    }
  }
  return finite;
}

void ClipWriter::write_floats(const double* const* channels, int frames, double gain) {
  const auto count = static_cast<std::size_t>(channels_);
  floats_.resize(static_cast<std::size_t>(frames) * count);
  bool finite = true;
  float most = 0;
  for (std::size_t channel = 0; channel < count; ++channel) {
    for (std::size_t i = 0; i < static_cast<std::size_t>(frames); ++i) {
      const auto value = static_cast<float>(channels[channel][i] * gain);
      finite &= std::abs(value) <= std::numeric_limits<float>::max();
      most = std::max(most, std::abs(value));
      floats_[i * count + channel] = value;
    }
  }
  if (!finite) refuse(channels, frames, gain);
  peak_ = std::max(peak_, static_cast<double>(most));
  errno = 0;
  if (sf_writef_float(sound_.get(), floats_.data(), frames) != frames) failed_in_system(errno);
}

void ClipWriter::close() {
  // The header with the final sizes. sf_close writes it too, but does not tell why that failed.
  errno = 0;
  sf_command(sound_.get(), SFC_UPDATE_HEADER_NOW, nullptr, 0);
  if (sf_error(sound_.get()) != SF_ERR_NO_ERROR) failed_in_system(errno);
  if (sf_close(sound_.release()) != SF_ERR_NO_ERROR) failed_in_system(errno);
  if (!descriptor_.close()) failed_in_system(errno);
}

void ClipWriter::refuse(const double* const* channels, int frames, double gain) const {
  for (int i = 0; i < frames; ++i) {
    for (int channel = 0; channel < channels_; ++channel) {
      const double value = channels[channel][i] * gain;
      if (std::isfinite(static_cast<float>(value))) continue;
      failed("because sample " + std::to_string(frames_written_ + i) + " of channel " + std::to_string(channel + 1) +
             " came out as " + format_number(value) + ", which no file should hold");
    }
  }
  failed("because a sample came out that is not a finite number");
}

void ClipWriter::failed_in_system(int error) const {
  const std::string told = sound_ ? sf_strerror(sound_.get()) : "the file could not be completed";
  failed("in '" + folder_.string() + "': " + (error != 0 ? system_text(error) : told) + "; " + write_advice(error));
}

void ClipWriter::failed(const std::string& reason) const {
  throw CannotError("cannot write '" + name_ + "' " + reason);
}

}  // namespace unsoldered
