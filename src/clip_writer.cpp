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

int sound_format(const TakeFormat& take, const ClipFormat& format) {
  if (format.kind == FileKind::mp3) return SF_FORMAT_MPEG | SF_FORMAT_MPEG_LAYER_III;
  if (format.kind == FileKind::ogg) return SF_FORMAT_OGG | SF_FORMAT_VORBIS;
  const int coding = format.depth == Depth::pcm16   ? SF_FORMAT_PCM_16
                     : format.depth == Depth::pcm24 ? SF_FORMAT_PCM_24
                                                    : SF_FORMAT_FLOAT;
  if (format.kind == FileKind::flac) return SF_FORMAT_FLAC | coding;
  const double bytes = static_cast<double>(take.frames) * take.channels * bytes_of(format.depth);
  // Plain WAV where it is legal: everything reads it. More than two channels want the extensible header.
  const int container = take.frames == 0 || bytes > kPlainWavBytes ? SF_FORMAT_RF64
                        : take.channels > 2                        ? SF_FORMAT_WAVEX
                                                                   : SF_FORMAT_WAV;
  return container | coding;
}

/// UTF-8 as Latin-1, '?' for what that does not have: the tags of MP3 files are written so, whatever they are given.
std::string latin1_text(const std::string& text) {
  std::string narrow;
  for (std::size_t i = 0; i < text.size(); ++i) {
    const auto byte = static_cast<unsigned char>(text[i]);
    if (byte < 0x80) {
      narrow += text[i];
    } else if ((byte == 0xc2 || byte == 0xc3) && i + 1 < text.size()) {
      narrow += static_cast<char>((byte << 6 | (static_cast<unsigned char>(text[++i]) & 0x3fu)) & 0xffu);
    } else if (byte >= 0xc0) {
      narrow += '?';  // the bytes that follow it are passed over
    }
  }
  return narrow;
}

/// Before the first sample. 0 is the least compression: 320 kbit/s or what the rate allows.
void set_best_quality(SNDFILE* sound, FileKind kind) {
  if (kind == FileKind::mp3) {
    int mode = SF_BITRATE_MODE_CONSTANT;
    double compression = 0;
    sf_command(sound, SFC_SET_BITRATE_MODE, &mode, sizeof mode);
    sf_command(sound, SFC_SET_COMPRESSION_LEVEL, &compression, sizeof compression);
  } else if (kind == FileKind::ogg) {
    double quality = 1;
    sf_command(sound, SFC_SET_VBR_ENCODING_QUALITY, &quality, sizeof quality);
  }
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

ClipWriter::ClipWriter(const std::filesystem::path& path, std::string name, TakeFormat take, ClipFormat format,
                       const ClipText& text)
    : name_(std::move(name)),
      folder_(path.parent_path()),
      descriptor_(::open(path.c_str(), O_RDWR | O_CREAT | O_EXCL | O_CLOEXEC, 0666)),
      channels_(take.channels),
      format_(format) {
  if (descriptor_.get() < 0) failed_in_system(errno);
  for (int channel = 0; channel < channels_; ++channel) {
    dither_.emplace_back(dither_seed(name_ + '/' + std::to_string(channel)));
  }
  SF_INFO info{};
  info.samplerate = take.rate_hz;
  info.channels = take.channels;
  info.format = sound_format(take, format);
  sound_.reset(sf_open_fd(descriptor_.get(), SFM_WRITE, &info, SF_FALSE));
  if (!sound_) failed(std::string("because ") + sf_strerror(nullptr));
  sf_command(sound_.get(), SFC_SET_CLIPPING, nullptr, SF_TRUE);
  sf_command(sound_.get(), SFC_SET_ADD_PEAK_CHUNK, nullptr, SF_FALSE);
  if ((info.format & SF_FORMAT_TYPEMASK) == SF_FORMAT_RF64) {
    sf_command(sound_.get(), SFC_RF64_AUTO_DOWNGRADE, nullptr, SF_TRUE);
  }
  set_best_quality(sound_.get(), format.kind);
  describe(text);
}

void ClipWriter::describe(const ClipText& text) {
  // A text that the format refuses is left away: the clip is the same without it.
  const bool narrow = format_.kind == FileKind::mp3;
  const auto set = [&](int what, const std::string& words) {
    if (!words.empty()) sf_set_string(sound_.get(), what, (narrow ? latin1_text(words) : words).c_str());
  };
  set(SF_STR_TITLE, text.title);
  set(SF_STR_COMMENT, text.comment);
  if (!text.title.empty() || !text.comment.empty()) set(SF_STR_SOFTWARE, "Unsoldered " UNSOLDERED_VERSION);
}

void ClipWriter::write(const double* const* channels, int frames, double gain) {
  if (is_integer(format_)) {
    write_integers(channels, frames, gain);
  } else {
    write_floats(channels, frames, gain);
  }
  frames_written_ += frames;
}

void ClipWriter::write_integers(const double* const* channels, int frames, double gain) {
  const bool flac = format_.kind == FileKind::flac;  // packs the samples itself, from the upper end of 32 bits
  const bool narrow = format_.depth == Depth::pcm16;
  const std::size_t width = narrow ? 2 : 3;
  const auto count = static_cast<std::size_t>(channels_);
  const double scale = narrow ? 0x1p15 : 0x1p23;
  const auto samples = static_cast<std::size_t>(frames) * count;
  if (flac) {
    wide_.resize(samples);
  } else {
    bytes_.resize(samples * width);
  }

  whole_.resize(static_cast<std::size_t>(frames));
  bool finite = true;
  std::int32_t most = 0;
  for (std::size_t channel = 0; channel < count; ++channel) {
    finite &= quantise(channels[channel], gain * scale, scale, channel);
    for (const std::int32_t whole : whole_) most = std::max(most, std::abs(whole));
    if (flac) {
      const std::int32_t step = narrow ? 0x10000 : 0x100;
      for (std::size_t i = 0; i < whole_.size(); ++i) wide_[i * count + channel] = whole_[i] * step;
    } else if (narrow) {
      pack<2>(whole_, bytes_.data() + channel * width, count * width);
    } else {
      pack<3>(whole_, bytes_.data() + channel * width, count * width);
    }
  }
  if (!finite) refuse(channels, frames, gain);
  peak_ = std::max(peak_, most / scale);
  errno = 0;
  if (flac) {
    check_written(sf_writef_int(sound_.get(), wide_.data(), frames) == frames);
  } else {
    const auto size = static_cast<sf_count_t>(bytes_.size());
    check_written(sf_write_raw(sound_.get(), bytes_.data(), size) == size);
  }
}

bool ClipWriter::quantise(const double* from, double factor, double scale, std::size_t channel) noexcept {
  // Loops without branches and without early ways out: the compiler makes them wide. NaN becomes -scale, and false.
  const auto clipped = [scale](double value) { return std::min(scale - 1, std::max(-scale, value)); };
  bool finite = true;
  if (format_.depth == Depth::pcm16) {
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
  check_written(sf_writef_float(sound_.get(), floats_.data(), frames) == frames);
}

void ClipWriter::check_written(bool complete) const {
  // The MP3 encoder takes all samples and leaves an error behind when the system does not take its bytes.
  if (!complete || sf_error(sound_.get()) != SF_ERR_NO_ERROR) failed_in_system(errno);
}

void ClipWriter::close() {
  errno = 0;
  if (format_.kind == FileKind::wav) {
    // The header with the final sizes. sf_close writes it too, but does not tell why that failed. (In Ogg files this
    // command throws away what the encoder has not written yet.)
    sf_command(sound_.get(), SFC_UPDATE_HEADER_NOW, nullptr, 0);
    if (sf_error(sound_.get()) != SF_ERR_NO_ERROR) failed_in_system(errno);
  }
  errno = 0;
  if (sf_close(sound_.release()) != SF_ERR_NO_ERROR) failed_in_system(errno);
  // Encoders write their last blocks now, and no one tells when the disk did not take them.
  const int error = errno;
  if (error == ENOSPC || error == EDQUOT || error == EFBIG || error == EIO) failed_in_system(error);
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
  // The library's own text is asked for only where the system has none: for some of its errors it prints one itself.
  const std::string told = error != 0 ? system_text(error)
                           : sound_   ? sf_strerror(sound_.get())
                                      : "the file could not be completed";
  failed("in '" + folder_.string() + "': " + told + "; " + write_advice(error));
}

void ClipWriter::failed(const std::string& reason) const {
  throw CannotError("cannot write '" + name_ + "' " + reason);
}

}  // namespace unsoldered
