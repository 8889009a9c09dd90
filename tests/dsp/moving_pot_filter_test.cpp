#include "dsp/moving_pot_filter.h"

#include <algorithm>
#include <chrono>
#include <cmath>
#include <complex>
#include <numbers>

#include "dsp/hookup_network.h"
#include "dsp/nodal.h"
#include "tests/catch.h"
#include "tests/dsp/example_hookups.h"

using namespace unsoldered;
using namespace unsoldered::test;
using Catch::Matchers::WithinAbs;

namespace {

using Samples = std::vector<double>;

Samples noise(int frames, unsigned seed) {
  std::mt19937 random(seed);
  std::normal_distribution<double> normal;
  Samples samples(static_cast<std::size_t>(frames));
  for (double& sample : samples) sample = normal(random);
  return samples;
}

Samples held(const Hookup& hookup, double dial, double rate_hz, const Samples& take) {
  HeldPotFilter filter(hookup, dial, rate_hz, 1);
  Samples out(take.size());
  const double* in = take.data();
  double* to = out.data();
  filter.process(&in, &to, static_cast<int>(take.size()));
  return out;
}

Samples turned(MovingPotFilter& filter, const Samples& take, const Samples& dials, int block) {
  Samples out(take.size());
  for (std::size_t done = 0; done < take.size(); done += static_cast<std::size_t>(block)) {
    const double* in = take.data() + done;
    double* to = out.data() + done;
    filter.process(&in, &to, static_cast<int>(std::min(take.size() - done, static_cast<std::size_t>(block))),
                   dials.data() + done);
  }
  return out;
}

double power(const Samples& samples) {
  double sum = 0;
  for (const double sample : samples) sum += sample * sample;
  return sum / static_cast<double>(samples.size());
}

double difference_db(const Samples& a, const Samples& b) {
  Samples difference(a.size());
  for (std::size_t i = 0; i < a.size(); ++i) difference[i] = a[i] - b[i];
  return 10 * std::log10(power(difference) / power(b) + 1e-40);
}

}  // namespace

TEST_CASE("A held knob has the response of the circuit within 0.01 dB and 0.1 degree to 20 kHz or 0.45 of the rate") {
  for (const NamedHookup& example : example_hookups()) {
    for (const double rate : {44100.0, 48000.0, 96000.0}) {
      for (const double dial : {0.5, 7.0, 10.0}) {
        Samples impulse(1 << 16, 0.0);
        impulse[0] = 1;
        const Samples out = held(example.hookup, dial, rate, impulse);
        const int latency = HeldPotFilter(example.hookup, dial, rate, 1).latency_frames();
        NodalAnalysis analysis(hookup_network(example.hookup, dial));
        for (const double hz : {200.0, 3000.0, 9000.0, 15000.0, std::min(20000.0, 0.45 * rate)}) {
          const std::complex<double> wanted = analysis.value(hz);
          if (std::abs(wanted) < 1e-4) continue;
          std::complex<double> sum = 0;
          for (std::size_t n = 0; n < out.size(); ++n)
            sum += out[n] * std::polar(1.0, -2 * std::numbers::pi * hz / rate * (static_cast<double>(n) - latency));
          INFO(example.name << ", " << rate << " Hz, dial " << dial << ", " << hz << " Hz");
          CHECK_THAT(20 * std::log10(std::abs(sum / wanted)), WithinAbs(0, 0.01));
          CHECK_THAT(std::arg(sum / wanted) * 180 / std::numbers::pi, WithinAbs(0, 0.1));
        }
      }
    }
  }
}

TEST_CASE(
    "An output that is a small difference of what passes the states and what they hold keeps its level and phase") {
  // A capacitor straight to a low resistance: -80 dB at 20 Hz, rising with frequency.
  Hookup hookup = line_hookup(0, 10e3, 100);
  hookup.extra.push_back(extra_part(PartKind::capacitor, 8e-9, {"source", "output"}));
  hookup.extra.push_back(extra_part(PartKind::resistor, 1e9, {"source", "top"}));
  hookup.extra.back().in_place_of = "source-top";
  for (const double rate : {44100.0, 48000.0, 192000.0}) {
    const int length = 1 << 16;
    Samples impulse(static_cast<std::size_t>(length), 0.0);
    impulse[0] = 1;
    const Samples out = held(hookup, 5, rate, impulse);
    MovingPotFilter filter(hookup, Knob::volume, rate, 1);
    const Samples moving = turned(filter, impulse, Samples(impulse.size(), 5.0), 512);
    NodalAnalysis analysis(hookup_network(hookup, 5));
    for (const double hz : {20.0, 60.0, 200.0, 350.0, 700.0, 2000.0, 20000.0}) {
      const std::complex<double> wanted = analysis.value(hz);
      std::complex<double> held_sum = 0;
      std::complex<double> moving_sum = 0;
      for (std::size_t n = 0; n < out.size(); ++n) {
        const auto turn =
            std::polar(1.0, -2 * std::numbers::pi * hz / rate * (static_cast<double>(n) - filter.latency_frames()));
        held_sum += out[n] * turn;
        moving_sum += moving[n] * turn;
      }
      INFO(rate << " Hz, " << hz << " Hz, level " << 20 * std::log10(std::abs(wanted)));
      for (const std::complex<double> sum : {held_sum, moving_sum}) {
        CHECK_THAT(20 * std::log10(std::abs(sum / wanted)), WithinAbs(0, 0.01));
        CHECK_THAT(std::arg(sum / wanted) * 180 / std::numbers::pi, WithinAbs(0, 0.1));
      }
    }
  }
}

TEST_CASE("The moving filter at rest agrees with the held one within -100 dB at every position") {
  const Samples take = noise(8192, 3);
  std::mt19937 random(5);
  for (const NamedHookup& example : example_hookups()) {
    for (const double rate : {44100.0, 96000.0}) {
      MovingPotFilter filter(example.hookup, Knob::volume, rate, 1);
      for (int i = 0; i < 12; ++i) {
        const double dial = i < 2 ? 10.0 - i * 0.01 : 10 * std::uniform_real_distribution<double>(0.01, 1)(random);
        filter.reset();
        const Samples moving = turned(filter, take, Samples(take.size(), dial), 512);
        INFO(example.name << ", " << rate << " Hz, dial " << dial);
        CHECK(difference_db(moving, held(example.hookup, dial, rate, take)) < -100);
      }
    }
  }
}

TEST_CASE("Block size and channel count do not change a sample") {
  const Hookup hookup = example_hookups()[1].hookup;
  const Samples take = noise(5000, 1);
  const Samples other = noise(5000, 2);
  Samples dials(5000);
  for (std::size_t i = 0; i < dials.size(); ++i) dials[i] = 5 + 5 * std::sin(static_cast<double>(i) * 0.003);
  MovingPotFilter mono(hookup, Knob::volume, 48000, 1);
  const Samples whole = turned(mono, take, dials, 5000);
  for (const int block : {1, 7, 64, 1000}) {
    mono.reset();
    CHECK(turned(mono, take, dials, block) == whole);
  }
  MovingPotFilter stereo(hookup, Knob::volume, 48000, 2);
  Samples left(5000);
  Samples right(5000);
  const double* in[] = {take.data(), other.data()};
  double* out[] = {left.data(), right.data()};
  stereo.process(in, out, 5000, dials.data());
  CHECK(left == whole);
  mono.reset();
  CHECK(right == turned(mono, other, dials, 5000));
}

TEST_CASE("Latency is under a millisecond at every rate, and the same held and turning") {
  for (const double rate : {44100.0, 48000.0, 88200.0, 96000.0, 192000.0}) {
    const Hookup hookup = pickup_hookup();
    const HeldPotFilter still(hookup, 5, rate, 1);
    CHECK(MovingPotFilter(hookup, Knob::volume, rate, 1).latency_frames() == still.latency_frames());
    CHECK(still.latency_frames() <= 0.001 * rate);
  }
}

TEST_CASE("The tone knob turns too, and one that is not there is refused") {
  const Hookup hookup = example_hookups()[1].hookup;
  const Samples take = noise(8192, 9);
  MovingPotFilter filter(hookup, Knob::tone, 48000, 1);
  Hookup closed = hookup;
  closed.tone->dial = 3;
  CHECK(difference_db(turned(filter, take, Samples(take.size(), 3), 512), held(closed, 10, 48000, take)) < -100);
  CHECK_THROWS_AS(MovingPotFilter(pickup_hookup(), Knob::tone, 48000, 1), std::runtime_error);
}

TEST_CASE("A no-load tone at 10 is disconnected, just below it is not") {
  Hookup hookup = example_hookups()[1].hookup;
  hookup.tone->no_load = true;
  hookup.tone->dial = 10;
  Hookup without = hookup;
  without.tone.reset();
  const Samples take = noise(8192, 9);
  MovingPotFilter filter(hookup, Knob::tone, 48000, 1);
  const Samples open = turned(filter, take, Samples(take.size(), 10), 512);
  CHECK(difference_db(open, held(without, 10, 48000, take)) < -100);
  filter.reset();
  CHECK(difference_db(turned(filter, take, Samples(take.size(), 9.99), 512), open) > -60);
}

TEST_CASE("Stored energy never grows without input, however the knob moves", "[slow]") {
  // Ten million samples of random and audio-rate motion over all examples.
  const std::vector<NamedHookup> examples = example_hookups();
  const int frames = 10'000'000 / static_cast<int>(examples.size()) + 1;
  std::mt19937 random(17);
  std::uniform_real_distribution<double> dial(0, 10);
  for (const NamedHookup& example : examples) {
    INFO(example.name);
    MovingPotFilter filter(example.hookup, Knob::volume, 48000, 1);
    const double silence = 0;
    const double* in = &silence;
    double sample = 0;
    double* out = &sample;
    bool grew = false;
    bool finite = true;
    double energy = 0;
    for (int n = 0; n < frames; ++n) {
      if (n % 20000 == 0) {  // wind it up again, then let it ring
        const Samples burst = noise(256, static_cast<unsigned>(random()));
        Samples sound(256);
        const double* from = burst.data();
        double* to = sound.data();
        const Samples still(256, dial(random));
        filter.process(&from, &to, 256, still.data());
        const Samples quiet(128, 0.0);
        from = quiet.data();
        filter.process(&from, &to, 128, still.data());
        energy = filter.stored_energy_j(0);
      }
      const double position = n % 40000 < 20000 ? dial(random) : 5 + 5 * std::sin(n * 2 * std::numbers::pi * 0.31);
      filter.process(&in, &out, 1, &position);
      const double now = filter.stored_energy_j(0);
      // Below 1e-280 J the squares themselves are denormal.
      grew = grew || now > energy * (1 + 1e-12) + 1e-280;
      finite = finite && std::isfinite(sample);
      energy = now;
    }
    CHECK_FALSE(grew);
    CHECK(finite);
  }
}

TEST_CASE("Audio-rate turning stays bounded by what the input can store") {
  const Samples take = noise(100000, 21);
  for (const NamedHookup& example : example_hookups()) {
    MovingPotFilter filter(example.hookup, Knob::volume, 48000, 1);
    std::mt19937 random(23);
    Samples dials(take.size());
    for (double& dial : dials) dial = 10 * std::uniform_real_distribution<double>(0, 1)(random);
    const Samples out = turned(filter, take, dials, 512);
    INFO(example.name);
    const double peak = std::abs(
        *std::max_element(out.begin(), out.end(), [](double a, double b) { return std::abs(a) < std::abs(b); }));
    CHECK(std::isfinite(peak));
    CHECK(peak < 100);
  }
}

TEST_CASE("A decaying tail does not slow down on denormal numbers") {
  using Clock = std::chrono::steady_clock;
  Hookup hookup = pickup_hookup();
  MovingPotFilter filter(hookup, Knob::volume, 48000, 1);
  const Samples dials(48000, 5.0);
  const auto time = [&](const Samples& take) {
    const auto start = Clock::now();
    turned(filter, take, dials, 512);
    return std::chrono::duration<double>(Clock::now() - start).count();
  };
  const double loud = time(noise(48000, 1));
  double tail = 0;
  for (int i = 0; i < 4; ++i) tail = std::max(tail, time(Samples(48000, 0.0)));
  WARN("time for a second of decay, as a ratio to one of sound: " << tail / loud);
  SUCCEED();
}
