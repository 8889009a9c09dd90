#include "dsp/fir.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <limits>
#include <numbers>

#include "dsp/fourier.h"

namespace unsoldered {
namespace {

constexpr double kFewestSeconds = 0.25;
constexpr double kMostSeconds = 10;
constexpr double kCutOff = 3e-4;   // 0.003 dB
constexpr double kDeepest = 1e-6;  // of the greatest magnitude: less is a zero, whose depth need not be kept
constexpr double kLowest = 20;     // Hz, of the band whose least magnitude counts

int grid_size(double rate_hz, double seconds) {
  return static_cast<int>(std::bit_ceil(static_cast<unsigned>(rate_hz * seconds)));
}

/// One period of the impulse response, time zero first, what comes before it at the end; and the least magnitude.
struct Period {
  std::vector<double> taps;
  double least = std::numeric_limits<double>::infinity();
};

Period period_of(const Response& response, double rate_hz, int size) {
  Spectrum values(static_cast<std::size_t>(size));
  Period period;
  double most = 0;
  for (int k = 0; k <= size / 2; ++k) {
    const double hz = rate_hz * k / size;
    const std::complex<double> value = response(hz);
    const auto here = static_cast<std::size_t>(k);
    const auto mirrored = static_cast<std::size_t>((size - k) % size);
    const bool real = here == mirrored || k == size / 2;
    values[here] = (real ? value.real() : value) / static_cast<double>(size);
    values[mirrored] = std::conj(values[here]);
    if (hz >= kLowest && hz <= pass_band_hz(rate_hz)) {
      period.least = std::min(period.least, std::abs(value));
      most = std::max(most, std::abs(value));
    }
  }
  Fourier(size).backward(values);
  for (const std::complex<double>& tap : values) period.taps.push_back(tap.real());
  period.least = std::max(period.least, kDeepest * most);
  return period;
}

/// How many of tap(0), tap(1) … come to no more than `most` together.
template <typename Tap>
std::size_t negligible(const Tap& tap, std::size_t count, double most) {
  double sum = 0;
  for (std::size_t i = 0; i < count; ++i) {
    sum += std::abs(tap(i));
    if (sum > most) return i;
  }
  return count;
}

}  // namespace

double smooth_step(double x) noexcept {
  if (x <= 0) return 0;
  if (x >= 1) return 1;
  const double inner = std::sin(std::numbers::pi / 2 * x);
  const double outer = std::sin(std::numbers::pi / 2 * inner * inner);
  return outer * outer;
}

double upper_fade(double hz, double rate_hz) noexcept {
  const double edge = pass_band_hz(rate_hz);
  return 1 - smooth_step((hz - edge) / (rate_hz / 2 - edge));
}

SampledFir sample_response(const Response& response, double rate_hz) {
  SampledFir sampled;
  for (double seconds = kFewestSeconds;; seconds *= 2) {
    const int size = grid_size(rate_hz, seconds);
    const Period period = period_of(response, rate_hz, size);
    const auto half = static_cast<std::size_t>(size / 2);
    const double most = kCutOff * period.least / 2;
    const auto& taps = period.taps;
    // Each end is cut where what lies beyond comes to little; where that is in the middle, the period is too short.
    const std::size_t after = half - negligible([&](std::size_t i) { return taps[half - 1 - i]; }, half, most);
    const std::size_t before = half - negligible([&](std::size_t i) { return taps[half + i]; }, half, most);
    sampled.settled = after < half - half / 8 && before < half - half / 8;
    if (!sampled.settled && seconds * 2 <= kMostSeconds) continue;
    sampled.fir.before = static_cast<int>(before);
    sampled.fir.taps.assign(taps.end() - static_cast<std::ptrdiff_t>(before), taps.end());
    sampled.fir.taps.insert(sampled.fir.taps.end(), taps.begin(), taps.begin() + static_cast<std::ptrdiff_t>(after));
    return sampled;
  }
}

}  // namespace unsoldered
