#include "src/loudness.h"

#include <algorithm>
#include <cmath>
#include <new>
#include <utility>

#include "dsp/error.h"

namespace unsoldered {
namespace {

constexpr double kOffset = 0.691;        // BS.1770-4, equation 2
constexpr double kRelativeGate = 0.1;    // 10 LU
constexpr int kStepsPerBlock = 4;        // 400 ms with an overlap of 75 %
constexpr int kInterpolatorFrames = 32;  // more than half the length of the true-peak filter

double energy_of(double lufs) { return std::pow(10, (lufs + kOffset) / 10); }
double lufs_of(double energy) { return 10 * std::log10(energy) - kOffset; }

/// BS.1770-4, annex 3: the weight follows the loudspeaker's direction. Orders of WAVE_FORMAT_EXTENSIBLE.
std::vector<int> directions(int channels) {
  switch (channels) {
    case 1:
      return {EBUR128_LEFT};
    case 2:
      return {EBUR128_LEFT, EBUR128_RIGHT};
    case 3:
      return {EBUR128_LEFT, EBUR128_RIGHT, EBUR128_CENTER};
    case 4:
      return {EBUR128_LEFT, EBUR128_RIGHT, EBUR128_LEFT_SURROUND, EBUR128_RIGHT_SURROUND};
    case 5:
      return {EBUR128_LEFT, EBUR128_RIGHT, EBUR128_CENTER, EBUR128_LEFT_SURROUND, EBUR128_RIGHT_SURROUND};
    case 6:
      return {EBUR128_LEFT,   EBUR128_RIGHT,         EBUR128_CENTER,
              EBUR128_UNUSED, EBUR128_LEFT_SURROUND, EBUR128_RIGHT_SURROUND};
    case 7:
      return {EBUR128_LEFT, EBUR128_RIGHT, EBUR128_CENTER, EBUR128_UNUSED, EBUR128_Mp180, EBUR128_Mp090, EBUR128_Mm090};
    default:
      return {EBUR128_LEFT,  EBUR128_RIGHT, EBUR128_CENTER, EBUR128_UNUSED,
              EBUR128_Mp135, EBUR128_Mm135, EBUR128_Mp090,  EBUR128_Mm090};
  }
}

}  // namespace

double Loudness::integrated_lufs(double gain) const {
  const double power = gain * gain;
  const auto mean_from = [&](double threshold) {
    double sum = 0;
    std::size_t count = 0;
    for (const double energy : energies_) {
      if (energy * power < threshold) continue;
      sum += energy * power;
      ++count;
    }
    return count == 0 ? 0 : sum / static_cast<double>(count);
  };
  const double absolute = energy_of(kAbsoluteGateLufs);
  const double loud = mean_from(absolute);
  return lufs_of(mean_from(std::max(absolute, kRelativeGate * loud)));
}

LoudnessMeter::LoudnessMeter(int rate_hz, int channels)
    : state_(ebur128_init(static_cast<unsigned>(channels), static_cast<unsigned long>(rate_hz),
                          EBUR128_MODE_S | EBUR128_MODE_TRUE_PEAK)),
      rate_hz_(rate_hz),
      channels_(channels),
      step_frames_((rate_hz + 5) / 10),
      until_block_(kStepsPerBlock * step_frames_) {
  if (!state_) throw std::bad_alloc();
  const std::vector<int> map = directions(channels);
  for (unsigned channel = 0; channel < map.size(); ++channel) ebur128_set_channel(state_.get(), channel, map[channel]);
}

void LoudnessMeter::add(const double* const* channels, int frames) {
  for (int done = 0; done < frames;) {
    const int part = std::min(frames - done, until_block_);
    const auto count = static_cast<std::size_t>(channels_);
    interleaved_.resize(static_cast<std::size_t>(part) * count);
    for (std::size_t channel = 0; channel < count; ++channel) {
      const double* from = channels[channel] + done;
      for (std::size_t i = 0; i < static_cast<std::size_t>(part); ++i) interleaved_[i * count + channel] = from[i];
    }
    add_interleaved(interleaved_.data(), part);
    done += part;
    frames_ += part;
    until_block_ -= part;
    if (until_block_ > 0) continue;
    result_.energies_.push_back(energy_of(momentary_lufs()));
    until_block_ = step_frames_;
  }
}

void LoudnessMeter::add_interleaved(const double* samples, int frames) {
  if (ebur128_add_frames_double(state_.get(), samples, static_cast<std::size_t>(frames)) != EBUR128_SUCCESS) {
    throw std::bad_alloc();
  }
}

double LoudnessMeter::momentary_lufs() const {
  double lufs = 0;
  ebur128_loudness_momentary(state_.get(), &lufs);
  return lufs;
}

double LoudnessMeter::short_term_lufs() const {
  double lufs = 0;
  ebur128_loudness_shortterm(state_.get(), &lufs);
  return lufs;
}

double LoudnessMeter::true_peak() const {
  double most = 0;
  for (unsigned channel = 0; channel < static_cast<unsigned>(channels_); ++channel) {
    double peak = 0;
    ebur128_true_peak(state_.get(), channel, &peak);
    most = std::max(most, peak);
  }
  return most;
}

Loudness LoudnessMeter::finish() {
  if (frames_ < static_cast<std::int64_t>(kShortestGatedSeconds) * rate_hz_) {
    // The window is 3 s whatever came, silence before the clip included: its energy is spread over too much time.
    const auto window = static_cast<std::int64_t>(10 * kShortestGatedSeconds) * step_frames_;
    const double share = static_cast<double>(std::min(frames_, window)) / static_cast<double>(window);
    result_.energies_ = {frames_ == 0 ? 0 : energy_of(short_term_lufs()) / share};
  }
  // The peak after the last sample is seen when the interpolator has moved past it.
  const std::vector<double> silence(static_cast<std::size_t>(kInterpolatorFrames) *
                                    static_cast<std::size_t>(channels_));
  add_interleaved(silence.data(), kInterpolatorFrames);
  result_.true_peak_ = true_peak();
  return std::move(result_);
}

}  // namespace unsoldered
