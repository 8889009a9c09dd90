#include "src/heard_through.h"

#include <algorithm>
#include <cmath>
#include <utility>

#include <filesystem>

#include "dsp/error.h"
#include "dsp/loudspeaker.h"
#include "src/number_text.h"
#include "src/sound_file.h"

namespace unsoldered {
namespace {

constexpr int kBlockFrames = 16384;

std::vector<Fir> read_impulse_response(SoundFileTake& file, const std::string& where) {
  const TakeFormat format = file.format();
  const auto channels = static_cast<std::size_t>(format.channels);
  const auto longest = static_cast<std::size_t>(kLongestImpulseResponseSeconds * format.rate_hz);
  std::vector<Fir> filters(channels);
  std::vector<double> block(channels * kBlockFrames);
  while (const int frames = file.read(block.data(), kBlockFrames)) {
    for (std::size_t channel = 0; channel < channels; ++channel) {
      for (std::size_t i = 0; i < static_cast<std::size_t>(frames); ++i) {
        filters[channel].taps.push_back(block[i * channels + channel]);
      }
    }
    if (filters.front().taps.size() > longest) {
      throw InputError(
          where + "is longer than " + format_number(kLongestImpulseResponseSeconds) +
          " s, which is the longest accepted; cut it there, or give the impulse response and not the take");
    }
  }
  std::size_t used = 0;
  for (const Fir& filter : filters) {
    const auto last = std::find_if(filter.taps.rbegin(), filter.taps.rend(), [](double tap) { return tap != 0; });
    used = std::max(used, static_cast<std::size_t>(filter.taps.rend() - last));
  }
  if (used == 0) {
    throw InputError(where + "is silent: every sample is 0, and so would be every clip; give one with sound in it");
  }
  for (Fir& filter : filters) filter.taps.resize(used);
  return filters;
}

}  // namespace

std::optional<HeardThrough> open_heard_through(const std::string& text, const TakeFormat& take,
                                               const std::string& where) {
  if (text == "nothing") return std::nullopt;
  const auto count = static_cast<std::size_t>(take.channels);
  const std::vector<std::size_t> one_for_all(count, 0);
  if (text == "guitar loudspeaker" || text == "guitar-loudspeaker") {
    return HeardThrough{make_plans({loudspeaker_fir(take.rate_hz)}, one_for_all)};
  }
  if (text.empty()) {
    throw InputError(where +
                     ": \"\" names nothing; give nothing, guitar-loudspeaker, or an impulse response as a WAV or "
                     "FLAC file");
  }
  if (std::error_code error; !std::filesystem::exists(text, error)) {
    throw InputError(
        where + ": \"" + text +
        "\" is neither a file that is there nor a known word; accepted are nothing, guitar-loudspeaker, and an "
        "impulse response as a WAV, FLAC, AIFF or W64 file");
  }
  SoundFileTake file(text, "impulse response");
  const std::string file_where = "impulse response '" + text + "': ";
  const TakeFormat format = file.format();
  if (format.rate_hz != take.rate_hz) {
    throw InputError(file_where + "its rate is " + std::to_string(format.rate_hz) + " Hz, that of the take " +
                     std::to_string(take.rate_hz) + " Hz; they must be the same, so resample the impulse response to " +
                     std::to_string(take.rate_hz) + " Hz");
  }
  if (format.channels != 1 && format.channels != take.channels) {
    throw InputError(file_where + std::to_string(format.channels) + " channels for a take of " +
                     std::to_string(take.channels) + "; give one with 1 channel, used for all, or as many as the take");
  }
  std::vector<std::size_t> channels = one_for_all;
  if (format.channels > 1) {
    for (std::size_t channel = 0; channel < count; ++channel) channels[channel] = channel;
  }
  return HeardThrough{make_plans(read_impulse_response(file, file_where), channels), {text}, file.warning()};
}

}  // namespace unsoldered
