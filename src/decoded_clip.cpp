#include "src/decoded_clip.h"

#include <string>
#include <vector>

#include "dsp/error.h"
#include "src/cancel.h"
#include "src/file_handle.h"
#include "src/loudness.h"

namespace unsoldered {

DecodedClip measure_decoded(const std::filesystem::path& path, const std::string& name) {
  SF_INFO info{};
  const SoundHandle sound(sf_open(path.c_str(), SFM_READ, &info));
  if (!sound) {
    throw CannotError("cannot write '" + name + "': the encoder's file cannot be read again (" + sf_strerror(nullptr) +
                      "); give --format flac or wav");
  }
  constexpr int kBlockFrames = 16384;
  const auto channels = static_cast<std::size_t>(info.channels);
  std::vector<double> interleaved(channels * kBlockFrames);
  std::vector<std::vector<double>> planar(channels, std::vector<double>(kBlockFrames));
  std::vector<const double*> pointers;
  for (const auto& channel : planar) pointers.push_back(channel.data());

  LoudnessMeter meter(info.samplerate, info.channels);
  DecodedClip decoded;
  while (const auto frames = static_cast<int>(sf_readf_double(sound.get(), interleaved.data(), kBlockFrames))) {
    for (std::size_t channel = 0; channel < channels; ++channel) {
      for (std::size_t i = 0; i < static_cast<std::size_t>(frames); ++i) {
        planar[channel][i] = interleaved[i * channels + channel];
      }
    }
    meter.add(pointers.data(), frames);
    decoded.frames += frames;
    stop_if_interrupted();
  }
  decoded.true_peak = meter.finish().true_peak();
  return decoded;
}

}  // namespace unsoldered
