#include "src/built_in_take.h"

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <numbers>

namespace unsoldered {
namespace {

constexpr int kRateHz = 48000;
constexpr std::size_t kPhraseFrames = 441600;  // 9.2 s
constexpr double kFadeSeconds = 0.8;
constexpr double kPeak = 0.501187233627272;  // -6 dBFS

struct Note {
  double start_s = 0;
  double length_s = 0;
  int key = 0;  // MIDI numbering: 69 is 440 Hz
  double strength = 1;
};

// A figure that climbs over a low E, the same shape answered over C, an open chord on A, and home by a run of four.
constexpr Note kPhrase[] = {
    {0.05, 2.50, 40, 1.00}, {0.35, 1.20, 59, 0.70}, {0.65, 1.20, 64, 0.75}, {0.95, 0.90, 66, 0.65},
    {1.25, 1.10, 67, 0.90}, {1.55, 1.10, 71, 0.80}, {1.85, 0.60, 69, 0.70}, {2.15, 0.40, 66, 0.60},
    {2.45, 2.40, 48, 1.00}, {2.75, 1.10, 64, 0.70}, {3.05, 1.10, 67, 0.75}, {3.35, 0.40, 69, 0.70},
    {3.65, 0.95, 74, 0.95}, {3.95, 0.95, 71, 0.75}, {4.25, 0.60, 67, 0.70}, {4.55, 0.40, 64, 0.60},
    {4.85, 2.20, 45, 0.75}, {4.88, 2.20, 52, 0.50}, {4.91, 2.20, 57, 0.50}, {4.94, 2.20, 59, 0.55},
    {4.97, 2.20, 64, 0.60}, {5.90, 0.30, 62, 0.60}, {6.20, 0.30, 64, 0.70}, {6.50, 0.30, 67, 0.80},
    {6.80, 0.30, 69, 0.70}, {7.10, 2.10, 40, 0.75}, {7.13, 2.10, 47, 0.55}, {7.16, 2.10, 55, 0.50},
    {7.19, 2.10, 59, 0.55}, {7.22, 2.10, 64, 0.55}, {7.25, 2.10, 66, 0.65},
};

/// Noise for the pick, -1..1: a 32-bit linear congruential generator (constants of Numerical Recipes, "ranqd1").
class PickNoise {
 public:
  explicit PickNoise(std::uint32_t seed) noexcept : state_(seed) {}
  double next() noexcept {
    state_ = state_ * 1664525u + 1013904223u;
    return static_cast<double>(state_) * 0x1p-31 - 1;
  }

 private:
  std::uint32_t state_;
};

/// One period of pick noise, softened a little and combed by where along the string it is plucked (paper, section on
/// pick position: 1 - z^-k with k that share of the period). Free of DC, which the loop would keep ringing.
std::vector<double> pluck(std::size_t period, double strength, std::uint32_t seed) {
  constexpr double kSoftness = 0.75;
  constexpr double kPickPosition = 0.13;
  PickNoise noise(seed);
  std::vector<double> burst(period);
  double soft = 0;
  double mean = 0;
  for (double& sample : burst) {
    soft = (1 - kSoftness) * noise.next() + kSoftness * soft;
    sample = soft;
    mean += soft / static_cast<double>(period);
  }
  const auto shift = std::max<std::size_t>(1, static_cast<std::size_t>(kPickPosition * static_cast<double>(period)));
  std::vector<double> combed(period);
  for (std::size_t i = 0; i < period; ++i) {
    combed[i] = strength * (burst[i] - burst[(i + period - shift) % period]);
  }
  return combed;
}

/// The string's loop: delay line, two-point average weighted (1 - s, s), loss factor, all-pass for the fraction of a
/// sample (paper, "Tuning" and "Decay Alteration").
void add_string(const Note& note, std::uint32_t seed, std::vector<double>& phrase) {
  constexpr double kAverage = 0.07;     // s: small, so that high partials last
  constexpr double kRingSeconds = 5.0;  // to -60 dB at the fundamental of key 40, shorter higher up
  constexpr double kReleaseSeconds = 0.06;
  const double frequency_hz = 440 * std::exp2((note.key - 69) / 12.0);
  const double ring_s = kRingSeconds * std::exp2((40 - note.key) / 24.0);

  // Loop delay in samples: line + s (the average's delay at low frequencies) + fraction in 0.1..1.1 for the all-pass.
  const double loop = kRateHz / frequency_hz - kAverage;
  const auto line = static_cast<std::size_t>(loop - 0.1);
  const double fraction = loop - static_cast<double>(line);
  const double w = 2 * std::numbers::pi * frequency_hz / kRateHz;
  const double allpass = std::sin(w * (1 - fraction) / 2) / std::sin(w * (1 + fraction) / 2);  // paper, equation for C
  const double loss = std::pow(0.001, 1 / (frequency_hz * ring_s));

  std::vector<double> string = pluck(line, note.strength, seed);
  double before_average = 0;
  double allpass_in = 0;
  double allpass_out = 0;
  const auto start = static_cast<std::size_t>(note.start_s * kRateHz);
  const auto frames = static_cast<std::size_t>((note.length_s + kReleaseSeconds) * kRateHz);
  double hand = 1;  // what the damping hand leaves
  const double damping = std::pow(0.001, 1 / (kReleaseSeconds * kRateHz));
  for (std::size_t i = 0; i < frames && start + i < phrase.size(); ++i) {
    double& here = string[i % line];
    const double sample = here;
    if (static_cast<double>(i) > note.length_s * kRateHz) hand *= damping;
    phrase[start + i] += hand * sample;
    const double averaged = loss * ((1 - kAverage) * sample + kAverage * before_average);
    before_average = sample;
    allpass_out = allpass * (averaged - allpass_out) + allpass_in;
    allpass_in = averaged;
    here = allpass_out;
  }
}

std::vector<double> play_phrase() {
  std::vector<double> phrase(kPhraseFrames);
  std::uint32_t seed = 1;
  for (const Note& note : kPhrase) add_string(note, seed++, phrase);

  const auto fade = static_cast<std::size_t>(kFadeSeconds * kRateHz);
  for (std::size_t i = 0; i < fade; ++i) {
    const double share = static_cast<double>(i) / static_cast<double>(fade);  // 0 at the very last sample
    phrase[phrase.size() - 1 - i] *= 0.5 - 0.5 * std::cos(std::numbers::pi * share);
  }
  double peak = 0;
  for (const double sample : phrase) peak = std::max(peak, std::abs(sample));
  for (double& sample : phrase) sample *= kPeak / peak;
  return phrase;
}

}  // namespace

const std::vector<double>& built_in_phrase() {
  static const std::vector<double> phrase = play_phrase();
  return phrase;
}

TakeFormat BuiltInTake::format() const noexcept { return {kRateHz, 1, kPhraseFrames}; }

int BuiltInTake::read(double* interleaved, int frames) {
  const auto& phrase = built_in_phrase();
  const std::size_t count = std::min(static_cast<std::size_t>(frames), phrase.size() - next_);
  std::copy_n(phrase.begin() + static_cast<std::ptrdiff_t>(next_), count, interleaved);
  next_ += count;
  return static_cast<int>(count);
}

}  // namespace unsoldered
