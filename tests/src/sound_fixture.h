// Sound files in a folder of their own, for tests.
#pragma once

#include <sndfile.h>
#include <stdlib.h>

#include <cmath>
#include <filesystem>
#include <fstream>
#include <functional>
#include <iterator>
#include <numbers>
#include <stdexcept>
#include <string>
#include <vector>

#include "dsp/hookup.h"

namespace unsoldered::test {

/// A new empty folder, removed with all that is in it.
class TemporaryFolder {
 public:
  TemporaryFolder() {
    std::string name = (std::filesystem::temp_directory_path() / "unsoldered-test-XXXXXX").string();
    if (::mkdtemp(name.data()) == nullptr) throw std::runtime_error("mkdtemp");
    path_ = name;
  }
  TemporaryFolder(const TemporaryFolder&) = delete;
  TemporaryFolder& operator=(const TemporaryFolder&) = delete;
  ~TemporaryFolder() {
    std::error_code ignored;
    std::filesystem::remove_all(path_, ignored);
  }
  std::filesystem::path operator/(const std::string& name) const { return path_ / name; }
  const std::filesystem::path& path() const { return path_; }

 private:
  std::filesystem::path path_;
};

struct Sound {
  int rate_hz = 48000;
  int channels = 1;
  int format = SF_FORMAT_WAV | SF_FORMAT_PCM_24;
  std::vector<double> samples;  // interleaved

  std::size_t frames() const { return samples.size() / static_cast<std::size_t>(channels); }
};

inline void write_sound(const std::filesystem::path& path, const Sound& sound) {
  SF_INFO info{};
  info.samplerate = sound.rate_hz;
  info.channels = sound.channels;
  info.format = sound.format;
  SNDFILE* file = sf_open(path.c_str(), SFM_WRITE, &info);
  if (file == nullptr) throw std::runtime_error(path.string() + ": " + sf_strerror(nullptr));
  sf_command(file, SFC_SET_CLIPPING, nullptr, SF_TRUE);
  const auto frames = static_cast<sf_count_t>(sound.frames());
  const bool complete = sf_writef_double(file, sound.samples.data(), frames) == frames;
  sf_close(file);
  if (!complete) throw std::runtime_error(path.string() + ": not written");
}

inline Sound read_sound(const std::filesystem::path& path) {
  SF_INFO info{};
  SNDFILE* file = sf_open(path.c_str(), SFM_READ, &info);
  if (file == nullptr) throw std::runtime_error(path.string() + ": " + sf_strerror(nullptr));
  Sound sound{info.samplerate, info.channels, info.format, {}};
  sound.samples.resize(static_cast<std::size_t>(info.frames * info.channels));
  sf_readf_double(file, sound.samples.data(), info.frames);
  sf_close(file);
  return sound;
}

inline std::string read_text(const std::filesystem::path& path) {
  std::ifstream file(path, std::ios::binary);
  return {std::istreambuf_iterator<char>(file), {}};
}

inline void write_text(const std::filesystem::path& path, const std::string& text) {
  std::ofstream(path, std::ios::binary) << text;
}

/// A sine in every channel, lower by half from each channel to the next.
inline Sound sine(double level, double hz, double seconds, int channels = 1, int rate_hz = 48000) {
  Sound sound;
  sound.rate_hz = rate_hz;
  sound.channels = channels;
  const auto frames = static_cast<std::size_t>(seconds * rate_hz);
  for (std::size_t i = 0; i < frames; ++i) {
    const double sample = level * std::sin(2 * std::numbers::pi * hz * static_cast<double>(i) / rate_hz);
    for (int channel = 0; channel < channels; ++channel) sound.samples.push_back(std::ldexp(sample, -channel));
  }
  return sound;
}

/// The message of the exception of kind Error that `call` throws; empty when it throws none.
template <typename Error>
std::string message_of(const std::function<void()>& call) {
  try {
    call();
  } catch (const Error& error) {
    return error.what();
  }
  return {};
}

/// 100 ohm into a linear 10k pot into 1M: 0.99 of the emf at 10, a little under half at 5, nothing that depends on frequency.
inline Hookup plain_line_hookup() {
  Hookup hookup;
  hookup.source.kind = SourceKind::line;
  hookup.source.resistance_ohm = 100;
  hookup.volume.pot.total_ohm = 10e3;
  hookup.load.resistance_ohm = 1e6;
  return hookup;
}

}  // namespace unsoldered::test
