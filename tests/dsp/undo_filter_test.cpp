#include "dsp/undo_filter.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>

#include "dsp/loudspeaker.h"
#include "tests/catch.h"

using unsoldered::design_undo_filter;
using unsoldered::Fir;
using unsoldered::pass_band_hz;
using unsoldered::Response;
using unsoldered::UndoFilter;

namespace {

using Complex = std::complex<double>;

Complex response_of(const Fir& fir, double hz, double rate_hz) {
  Complex sum = 0;
  for (std::size_t k = 0; k < fir.taps.size(); ++k) {
    const double n = static_cast<double>(k) - fir.before;
    sum += fir.taps[k] * std::polar(1.0, -2 * std::numbers::pi * hz * n / rate_hz);
  }
  return sum;
}

double db(double ratio) { return 20 * std::log10(ratio); }

/// First-order low-pass and high-pass.
Response low_pass(double corner_hz) {
  return [=](double hz) { return 1.0 / Complex(1, hz / corner_hz); };
}
Response high_pass(double corner_hz) {
  return [=](double hz) { return Complex(0, hz / corner_hz) / Complex(1, hz / corner_hz); };
}
Response flat(double level) {
  return [=](double) { return Complex(level, 0); };
}

}  // namespace

TEST_CASE("What was recorded through is undone with its exact phase over the whole pass band") {
  for (const double rate : {8000.0, 44100.0, 48000.0, 96000.0}) {
    for (const Response& through : {low_pass(3000), low_pass(300), flat(-0.02)}) {
      const auto undo = design_undo_filter(through, {through}, 24, rate);
      REQUIRE(undo);
      CHECK(undo->settled);
      CHECK(undo->limited.empty());
      CHECK_FALSE(undo->from_hz);
      for (const double hz : {0.0, 20.0, 100.0, 1000.0, 0.999 * pass_band_hz(rate)}) {
        INFO("rate " << rate << ", " << hz << " Hz");
        CHECK(std::abs(response_of(undo->fir, hz, rate) * through(hz) - 1.0) < 1e-3);
      }
    }
  }
}

TEST_CASE("The boost of the finished ratio is limited, from the frequency where it passes the limit") {
  // Flat through a low-pass of 1 kHz: the ratio is 24 dB at 1 kHz * sqrt(10^2.4 - 1).
  const auto undo = design_undo_filter(low_pass(1000), {flat(0.5), flat(1), flat(0)}, 24, 48000);
  REQUIRE(undo);
  REQUIRE(undo->limited.size() == 1);
  const double start = 1000 * std::sqrt(std::pow(10, 2.4) - 1);
  CHECK(std::abs(undo->limited[0].from_hz / start - 1) < 1e-6);
  CHECK(undo->limited[0].to_hz == pass_band_hz(48000));
  CHECK(std::abs(db(std::abs(response_of(undo->fir, 17500, 48000))) - 24) < 0.01);
  CHECK(std::abs(db(std::abs(response_of(undo->fir, 10000, 48000))) - db(std::abs(1.0 / low_pass(1000)(10000)))) <
        0.01);
}

TEST_CASE("No boost is wanted: a limit of 0 dB leaves at most the level of the take") {
  const auto undo = design_undo_filter(low_pass(1000), {flat(1)}, 0, 48000);
  REQUIRE(undo);
  for (const double hz : {50.0, 500.0, 5000.0, 15000.0})
    CHECK(std::abs(db(std::abs(response_of(undo->fir, hz, 48000)))) < 0.01);
}

TEST_CASE(
    "Where what was recorded through vanishes towards 0 Hz, the filter stays finite and says from where it undoes") {
  const Response through = high_pass(40);
  const auto undo = design_undo_filter(through, {through}, 24, 48000);
  REQUIRE(undo);
  REQUIRE(undo->from_hz);
  CHECK(*undo->from_hz < 20);
  CHECK(undo->settled);
  CHECK(std::abs(response_of(undo->fir, 0, 48000)) < 1e-3);
  for (const double hz : {*undo->from_hz, 10.0, 20.0, 40.0, 1000.0})
    CHECK(std::abs(response_of(undo->fir, hz, 48000) * through(hz) - 1.0) < 2e-3);
  // Played flat, the ratio is 12 dB at 40 Hz / sqrt(10^1.2 - 1), and more below.
  const auto flattened = design_undo_filter(through, {flat(1)}, 12, 48000);
  REQUIRE(flattened);
  REQUIRE(flattened->limited.size() == 1);
  CHECK(std::abs(flattened->limited[0].to_hz * std::sqrt(std::pow(10, 1.2) - 1) / 40 - 1) < 1e-6);
  for (const double hz : {0.5, 1.0, 2.0, 4.0, 8.0, 10.0})
    CHECK(db(std::abs(response_of(flattened->fir, hz, 48000))) < 12.01);
}

TEST_CASE("Where hardly anything came through, the filter is finite and says so, and where nothing did there is none") {
  const Response notch = [](double hz) { return Complex(0, 1) * (hz / 1000 - 1000 / std::max(hz, 1e-9)) * 1e-4; };
  const auto undo = design_undo_filter(notch, {notch}, 24, 48000);
  REQUIRE(undo);
  REQUIRE(undo->beyond_reach.size() == 1);
  CHECK(undo->beyond_reach[0].from_hz < 1000);
  CHECK(undo->beyond_reach[0].to_hz > 1000);
  for (const double tap : undo->fir.taps) REQUIRE(std::isfinite(tap));
  CHECK_FALSE(design_undo_filter(flat(0), {flat(1)}, 24, 48000));
  CHECK_FALSE(design_undo_filter(flat(9e-7), {flat(1)}, 24, 48000));
}

TEST_CASE("The loudspeaker's filter is its prototype at every rate") {
  for (const double rate : {8000.0, 44100.0, 48000.0, 192000.0}) {
    const Fir fir = unsoldered::loudspeaker_fir(rate);
    for (const double hz : {20.0, 75.0, 500.0, 3000.0, 0.95 * std::min(20000.0, pass_band_hz(rate))}) {
      const Complex due = unsoldered::loudspeaker_response(hz);
      INFO("rate " << rate << ", " << hz << " Hz");
      CHECK(std::abs(response_of(fir, hz, rate) / due - 1.0) < 2e-3);
    }
  }
}
