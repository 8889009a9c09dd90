// A turning knob against the same circuit in 64 exact steps a sample. The input is the same interpolated curve, so what is
// left is the error of the table and its mixing alone; against ngspice, whole, see tests/reference/turn_render_test.py.
#include <algorithm>
#include <cmath>
#include <numbers>

#include "dsp/exact_step.h"
#include "dsp/hookup_network.h"
#include "dsp/interpolator.h"
#include "dsp/moving_pot_filter.h"
#include "dsp/several_knobs_filter.h"
#include "tests/catch.h"
#include "tests/dsp/example_hookups.h"

using namespace unsoldered;
using namespace unsoldered::test;

namespace {

using Samples = std::vector<double>;

struct Comparison {
  double error_db = 0;
  double step_ratio = 0;  // largest sample-to-sample step, as a ratio to the reference's
};

Samples sines_to_18k(int frames, double rate_hz) {
  std::mt19937 random(29);
  Samples take(static_cast<std::size_t>(frames));
  for (int i = 1; i <= 24; ++i) {
    const double phase = std::uniform_real_distribution<double>(0, 2 * std::numbers::pi)(random);
    for (std::size_t n = 0; n < take.size(); ++n)
      take[n] += std::sin(2 * std::numbers::pi * 750 * i / rate_hz * static_cast<double>(n) + phase) / 24;
  }
  return take;
}

/// dial(t) in samples of the output; compared from `first` to `last`.
template <typename Dial>
Comparison compare(const Hookup& hookup, const Knob& knob, double rate_hz, int first, int last, const Dial& dial) {
  constexpr int parts = 64;
  const int frames = last + 1;
  const Samples take = sines_to_18k(frames, rate_hz);
  const Interpolator interpolator(rate_hz);
  const int latency = interpolator.latency();
  const int taps = interpolator.taps();

  MovingPotFilter filter(hookup, knob, rate_hz, 1);
  Samples dials(take.size());
  for (std::size_t n = 0; n < dials.size(); ++n) dials[n] = dial(static_cast<double>(n));
  Samples got(take.size());
  const double* in = take.data();
  double* out = got.data();
  filter.process(&in, &out, frames, dials.data());

  const Circuit circuit = hookup_circuit(hookup);
  const std::vector<PotPlace> moving = pots_of(circuit, knob);
  const StateSpaceFamily family(circuit, moving);
  const auto space_at = [&](double position) {
    std::vector<PotPosition> positions;
    for (const PotPlace& place : moving)
      positions.push_back({fraction_below(circuit.stages[place.stage].pots[place.pot], position)});
    return family.at(positions);
  };
  std::vector<Polynomials<double>> powers;
  for (int k = 0; k < parts; ++k) powers.push_back(chebyshev_powers(static_cast<double>(k) / parts, 1.0 / parts));
  Eigen::VectorXd state = Eigen::VectorXd::Zero(family.states());
  const auto step_at = [&](double position) {
    return exact_step_in_double(space_at(position), 1 / static_cast<Long>(rate_hz * parts));
  };
  double error = 0;
  double power = 0;
  double got_step = 0;
  double due_step = 0;
  double due_before = 0;
  Step<double> step;
  double stepped_at = -1;
  for (int n = 0; n < frames; ++n) {
    Eigen::Matrix<double, Interpolator::moments, 1> moment = Eigen::Matrix<double, Interpolator::moments, 1>::Zero();
    for (int p = 0; p < Interpolator::moments; ++p)
      for (int k = 0; k < taps; ++k)
        if (const int i = n - taps + 1 + k; i >= 0)
          moment(p) += interpolator.weight(p, k) * take[static_cast<std::size_t>(i)];
    for (int k = 0; k < parts; ++k) {
      const double position = n == 0 ? dial(0) : dial(n - 1 + (k + 0.5) / parts);
      if (position != stepped_at) step = step_at(position);
      stepped_at = position;
      state = step.transition * state + step.drive * (powers[static_cast<std::size_t>(k)] * moment);
    }
    const StateSpace end = space_at(dial(n));
    const double direct = n >= latency ? take[static_cast<std::size_t>(n - latency)] : 0;
    const double due = (end.c.cast<double>() * state).value() + static_cast<double>(end.d) * direct;
    const auto i = static_cast<std::size_t>(n);
    if (n >= first) {
      error += (got[i] - due) * (got[i] - due);
      power += due * due;
      if (n > first) {
        got_step = std::max(got_step, std::abs(got[i] - got[i - 1]));
        due_step = std::max(due_step, std::abs(due - due_before));
      }
    }
    due_before = due;
  }
  return {10 * std::log10(error / power), got_step / due_step};
}

std::vector<NamedHookup> hard_hookups() {
  std::vector<NamedHookup> all = example_hookups();
  Hookup piezo = piezo_hookup();
  piezo.source.capacitance_f = 1.2e-9;
  piezo.source.leak_ohm = 50e6;
  piezo.volume.pot.taper = parse_taper("audio 20%");
  piezo.cable = Cable{300e-12, {}};
  all.push_back({"piezo, audio", piezo});
  Hookup line = line_hookup(100, 10e3, 10e3);
  line.volume.pot.taper = parse_taper("audio 15%");
  line.cable = Cable{2.2e-9, {}};
  all.push_back({"line, audio, 2.2 nF", line});
  Hookup filtered = pickup_hookup();
  filtered.volume.pot.taper = parse_taper("ideal audio 15%");
  Tone tone;
  tone.pot.total_ohm = 250e3;
  tone.pot.taper = parse_taper("linear");
  tone.capacitor_f = 10e-9;
  tone.dial = 3;
  tone.position = TonePosition::output;
  filtered.tone = tone;
  all.push_back({"ideal audio, tone at the output", filtered});
  Hookup reverse = line_hookup(600, 50e3, 22e3);
  reverse.source.capacitance_f = 1e-6;
  reverse.volume.pot.taper = parse_taper("ideal reverse audio 15%");
  reverse.volume.pot.end_ohm = 20;
  reverse.treble_bleed = TrebleBleed{1e-9, {}, {}, {}};
  reverse.cable = Cable{1e-9, {}};
  all.push_back({"line through 1 uF, ideal reverse, bleed", reverse});
  return all;
}

struct OtherKnob {
  const char* name;
  Hookup hookup;
  Knob knob;
};

/// Knobs beside the volume: blends of both laws, a second volume, a pedal past a buffer.
std::vector<OtherKnob> other_knobs() {
  Hookup two = pickup_hookup();
  SecondSource second;
  second.source = two.source;
  second.source.inductance_h = 4.5;
  second.volume = two.volume;
  second.volume->dial = 8;
  two.second = second;
  Hookup mn = two;
  mn.blend = Blend{BlendLaw::mn, two.volume.pot, 5};
  Hookup linear = mn;
  linear.blend->law = BlendLaw::linear;
  Hookup pedal = two;
  Stage buffer;
  buffer.buffer = Buffer{1e6, 20e-12, 1000, 6};
  Stage volume;
  volume.volume = Volume{};
  volume.volume->pot.total_ohm = 25e3;
  volume.cable = Cable{500e-12, {}};
  pedal.then = {buffer, volume};
  return {{"MN blend", mn, {KnobKind::blend}},
          {"linear blend", linear, {KnobKind::blend}},
          {"second volume", two, {KnobKind::second_volume}},
          {"pedal", pedal, parse_knob(pedal, "pedal")}};
}

}  // namespace

TEST_CASE("Full turns up and down, in 50 and in 130 ms, are within -80 dB of fine exact steps", "[slow]") {
  double worst_db = -300;
  for (const NamedHookup& example : hard_hookups()) {
    for (const bool up : {true, false}) {
      for (const double seconds : {0.05, 0.13}) {
        const double rate = up ? 44100 : 48000;
        const double turn = seconds * rate;
        const Comparison found =
            compare(example.hookup, Knob::volume, rate, 100, 100 + static_cast<int>(turn), [&](double n) {
              const double share = std::clamp((n - 100) / turn, 0.0, 1.0);
              return 10 * (up ? share : 1 - share);
            });
        INFO(example.name << (up ? ", up" : ", down") << " in " << seconds << " s");
        CHECK(found.error_db < -80);
        CHECK(found.step_ratio < 1.001);
        worst_db = std::max(worst_db, found.error_db);
      }
    }
  }
  WARN("worst error of a full turn: " << worst_db << " dB");
}

TEST_CASE(
    "A jump, played as 5 ms, is near: within -40 dB of fine exact steps, without a larger step than theirs by 1 %") {
  double worst_db = -300;
  for (const NamedHookup& example : hard_hookups()) {
    const Comparison found = compare(example.hookup, Knob::volume, 48000, 100, 600,
                                     [&](double n) { return 2 + 8 * std::clamp((n - 200) / 240, 0.0, 1.0); });
    INFO(example.name << ": " << found.error_db << " dB");
    CHECK(found.error_db < -40);
    CHECK(found.step_ratio < 1.01);
    worst_db = std::max(worst_db, found.error_db);
  }
  WARN("worst error of a jump: " << worst_db << " dB");
}

TEST_CASE("Other knobs turn as well as the volume: blends of both laws, a second volume, a pedal past a buffer",
          "[slow]") {
  for (const OtherKnob& one : other_knobs()) {
    for (const bool up : {true, false}) {
      const double turn = 0.05 * 48000;
      const Comparison found = compare(one.hookup, one.knob, 48000, 100, 100 + static_cast<int>(turn), [&](double n) {
        const double share = std::clamp((n - 100) / turn, 0.0, 1.0);
        return 10 * (up ? share : 1 - share);
      });
      INFO(one.name << (up ? ", up: " : ", down: ") << found.error_db << " dB");
      CHECK(found.error_db < -80);
      CHECK(found.step_ratio < 1.001);
    }
  }
}

TEST_CASE("Other knobs at rest agree with the same held within -100 dB, the middle of a blend included") {
  const Samples take = sines_to_18k(6000, 48000);
  for (const OtherKnob& one : other_knobs()) {
    MovingPotFilter moving(one.hookup, one.knob, 48000, 1);
    for (const double dial : {0.0, 0.3, 3.3, 4.98, 5.0, 5.02, 8.1, 9.9, 10.0}) {
      Hookup at = one.hookup;
      set_dial(at, one.knob, dial);
      HeldPotFilter held(hookup_circuit(at), 48000, 1);
      Samples a(take.size());
      Samples b(take.size());
      const Samples dials(take.size(), dial);
      const double* in = take.data();
      double* out = a.data();
      moving.reset();
      moving.process(&in, &out, static_cast<int>(take.size()), dials.data());
      out = b.data();
      held.process(&in, &out, static_cast<int>(take.size()));
      double error = 0;
      double power = 0;
      for (std::size_t n = 0; n < take.size(); ++n) {
        error += (a[n] - b[n]) * (a[n] - b[n]);
        power += b[n] * b[n];
      }
      INFO(one.name << " at " << dial << ": " << 10 * std::log10(error / power));
      // A milliohm stands for a closed section; what is left of a knob at its end is not compared.
      CHECK((error < 1e-10 * power || power < 1e-12));
    }
  }
}

TEST_CASE("Other knobs at audio rate: what is stored never grows without input, past a buffer it dies away", "[slow]") {
  std::mt19937 random(31);
  std::uniform_real_distribution<double> dial(0, 10);
  const int frames = 600000;
  for (const OtherKnob& one : other_knobs()) {
    INFO(one.name);
    MovingPotFilter filter(one.hookup, one.knob, 48000, 1);
    const bool chain = one.hookup.then.size() > 1;
    const Samples burst = sines_to_18k(256, 48000);
    Samples sound(256);
    Samples still(256, 7);
    const double* in = burst.data();
    double* out = sound.data();
    filter.process(&in, &out, 256, still.data());
    const Samples quiet(128, 0.0);
    in = quiet.data();
    filter.process(&in, &out, 128, still.data());
    const double begin = filter.stored_energy_j(0);
    double energy = begin;
    double most = begin;
    bool grew = false;
    bool finite = true;
    for (int n = 0; n < frames; ++n) {
      const double position = n % 2000 < 1000 ? dial(random) : 5 + 5 * std::sin(n * 2.0);
      const double silence = 0;
      in = &silence;
      double sample = 0;
      out = &sample;
      filter.process(&in, &out, 1, &position);
      const double now = filter.stored_energy_j(0);
      grew = grew || now > energy * (1 + 1e-12) + 1e-280;
      finite = finite && std::isfinite(sample);
      most = std::max(most, now);
      energy = now;
    }
    CHECK(finite);
    if (!chain) CHECK_FALSE(grew);
    CHECK(most < 100 * begin);  // past a buffer it may first rise by what comes through the amplifier
    CHECK(energy < 1e-12 * begin);
  }
}

TEST_CASE("Several knobs at once: with one moving it is the same as that one alone") {
  Hookup hookup = example_hookups()[1].hookup;  // with a tone
  const double rate = 48000;
  const int frames = 6000;
  const Samples take = sines_to_18k(frames, rate);
  Samples volume(take.size());
  for (std::size_t n = 0; n < volume.size(); ++n)
    volume[n] = 10 * std::clamp((static_cast<double>(n) - 1000) / 4800, 0.0, 1.0);
  const Samples tone(take.size(), hookup.tone->dial);
  Samples alone(take.size());
  Samples together(take.size());
  const double* in = take.data();
  double* out = alone.data();
  MovingPotFilter one(hookup, Knob::volume, rate, 1);
  one.process(&in, &out, frames, volume.data());
  out = together.data();
  SeveralKnobsFilter both(hookup_circuit(hookup), {Knob::tone, Knob::volume}, rate, 1);
  const double* dials[] = {tone.data(), volume.data()};
  both.process(&in, &out, frames, dials);
  CHECK(both.latency_frames() == one.latency_frames());
  double error = 0;
  double power = 0;
  for (std::size_t n = 0; n < take.size(); ++n) {
    error += (together[n] - alone[n]) * (together[n] - alone[n]);
    power += alone[n] * alone[n];
  }
  CHECK(10 * std::log10(error / power) < -85);
}

namespace {

/// Of two sounds, dB.
double difference_db(const Samples& got, const Samples& due) {
  double error = 0;
  double power = 0;
  for (std::size_t n = 0; n < due.size(); ++n) {
    error += (got[n] - due[n]) * (got[n] - due[n]);
    power += due[n] * due[n];
  }
  return 10 * std::log10(error / power);
}

Samples with_one(const Hookup& hookup, const Knob& knob, const Samples& take, const Samples& dials) {
  MovingPotFilter filter(hookup, knob, 48000, 1);
  Samples out(take.size());
  const double* in = take.data();
  double* to = out.data();
  filter.process(&in, &to, static_cast<int>(take.size()), dials.data());
  return out;
}

/// `other` stays at its dial.
Samples with_two(const Hookup& hookup, const Knob& knob, const Knob& other, double other_dial, const Samples& take,
                 const Samples& dials) {
  SeveralKnobsFilter filter(hookup_circuit(hookup), {other, knob}, 48000, 1);
  Samples out(take.size());
  const Samples still(take.size(), other_dial);
  const double* in = take.data();
  double* to = out.data();
  const double* both[] = {still.data(), dials.data()};
  filter.process(&in, &to, static_cast<int>(take.size()), both);
  return out;
}

}  // namespace

TEST_CASE("Many small steps of a knob add up the same with several knobs as with one") {
  const Hookup hookup = example_hookups()[1].hookup;
  const Samples take = sines_to_18k(24000, 48000);
  Samples stairs(take.size());
  for (std::size_t n = 0; n < stairs.size(); ++n) stairs[n] = 2 + 0.00015 * static_cast<double>(n / 48);
  const Samples one = with_one(hookup, Knob::volume, take, stairs);
  CHECK(difference_db(with_two(hookup, Knob::volume, Knob::tone, hookup.tone->dial, take, stairs), one) < -60);
}

TEST_CASE("A no-load tone that turns to 10 and back is the same computed step by step, within -80 dB") {
  Hookup hookup = example_hookups()[1].hookup;
  hookup.tone->no_load = true;
  const Samples take = sines_to_18k(12000, 48000);
  Samples dials(take.size());
  for (std::size_t n = 0; n < dials.size(); ++n) {
    const auto t = static_cast<double>(n);
    dials[n] = std::min({9 + t / 4000, 10.0, 10 - (t - 8000) / 2000});  // up to 10, there for 4000 samples, and down
  }
  const Samples due = with_two(hookup, Knob::tone, Knob::volume, 10, take, dials);
  CHECK(difference_db(with_one(hookup, Knob::tone, take, dials), due) < -80);
}
