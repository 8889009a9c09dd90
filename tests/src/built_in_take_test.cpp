#include "src/built_in_take.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>

#include "tests/catch.h"

using Catch::Matchers::WithinAbs;
using unsoldered::built_in_phrase;

namespace {

/// Power of the phrase in a band, by a Hann-windowed Fourier sum at frequencies 50 Hz apart over `seconds` from `start_s`.
double band_power(double start_s, double seconds, double from_hz, double to_hz) {
  const auto& phrase = built_in_phrase();
  const auto first = static_cast<std::size_t>(start_s * 48000);
  const auto count = static_cast<std::size_t>(seconds * 48000);
  double power = 0;
  for (double hz = from_hz; hz < to_hz; hz += 50) {
    std::complex<double> sum = 0;
    for (std::size_t i = 0; i < count; ++i) {
      const double share = static_cast<double>(i) / static_cast<double>(count);
      const double window = 0.5 - 0.5 * std::cos(2 * std::numbers::pi * share);
      sum +=
          window * phrase[first + i] * std::polar(1.0, -2 * std::numbers::pi * hz * static_cast<double>(i) / 48000.0);
    }
    power += std::norm(sum);
  }
  return power;
}

}  // namespace

TEST_CASE("The built-in take is nine seconds in mono at 48 kHz with a peak of -6 dBFS") {
  unsoldered::BuiltInTake take;
  CHECK(take.format().rate_hz == 48000);
  CHECK(take.format().channels == 1);
  const auto& phrase = built_in_phrase();
  CHECK(static_cast<std::int64_t>(phrase.size()) == take.format().frames);
  CHECK_THAT(static_cast<double>(phrase.size()) / 48000, WithinAbs(9.2, 0.3));
  double peak = 0;
  for (const double sample : phrase) peak = std::max(peak, std::abs(sample));
  CHECK_THAT(20 * std::log10(peak), WithinAbs(-6, 1e-9));
}

TEST_CASE("The built-in take is read to its end in blocks of any size, the same every time") {
  for (const int block : {1000, 16384, 1000000}) {
    unsoldered::BuiltInTake take;
    std::vector<double> all;
    std::vector<double> part(static_cast<std::size_t>(block));
    while (const int frames = take.read(part.data(), block)) all.insert(all.end(), part.begin(), part.begin() + frames);
    CHECK(all == built_in_phrase());
    CHECK(take.read(part.data(), block) == 0);
  }
}

TEST_CASE("The built-in take starts and ends without a click and carries no direct current") {
  const auto& phrase = built_in_phrase();
  CHECK(phrase.front() == 0);
  CHECK(phrase.back() == 0);
  for (std::size_t i = phrase.size() - 480; i < phrase.size(); ++i) {
    if (std::abs(phrase[i]) > 1e-5) FAIL("the last 10 ms are not quiet: " << phrase[i]);
  }
  double sum = 0;
  for (const double sample : phrase) sum += sample;
  CHECK(std::abs(sum / static_cast<double>(phrase.size())) < 1e-4);
}

TEST_CASE("The built-in take has treble to lose: 10 to 20 kHz is heard beside 200 to 800 Hz at each pluck") {
  // -40 dB: a lost octave on top would still be noticed. Where the low string and where the chord are struck.
  for (const double start_s : {0.05, 2.45, 4.85}) {
    const double treble_db =
        10 * std::log10(band_power(start_s, 0.1, 10000, 20000) / band_power(start_s, 0.1, 200, 800));
    CAPTURE(start_s, treble_db);
    CHECK(treble_db > -40);
  }
}

TEST_CASE("The built-in take's strings are in tune") {
  // The low E struck at 0.05 s and 300 ms long alone: its 8th partial, 659.255 Hz, by the phase it gains in 0.1 s.
  const auto phase = [](double start_s) {
    const auto& phrase = built_in_phrase();
    std::complex<double> sum = 0;
    const auto first = static_cast<std::size_t>(start_s * 48000);
    for (std::size_t i = 0; i < 7200; ++i) {  // 150 ms, a Hann window narrow enough to leave the neighbours out
      const double window = 0.5 - 0.5 * std::cos(2 * std::numbers::pi * static_cast<double>(i) / 7200);
      sum += window * phrase[first + i] *
             std::polar(1.0, -2 * std::numbers::pi * 659.25511 * static_cast<double>(first + i) / 48000.0);
    }
    return std::arg(sum);
  };
  const double off_hz = std::remainder(phase(0.18) - phase(0.08), 2 * std::numbers::pi) / (2 * std::numbers::pi * 0.1);
  CHECK_THAT(1200 * std::log2(1 + off_hz / 659.25511), WithinAbs(0, 3));  // cents
}
