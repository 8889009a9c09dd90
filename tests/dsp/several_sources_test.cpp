// Second sources, selectors, blends, further stages, buffers and stereo gangs against what can be worked out by hand.
#include <cmath>
#include <complex>

#include "dsp/hookup_network.h"
#include "dsp/hookup_response.h"
#include "dsp/knob_table.h"
#include "tests/catch.h"
#include "tests/dsp/example_hookups.h"

using namespace unsoldered;
using namespace unsoldered::test;
using Catch::Matchers::WithinAbs;
using Catch::Matchers::WithinRel;

namespace {

/// Two line sources of `source_ohm` without controls that matter: pots so large that they do not load.
Hookup two_lines(double source_ohm, double load_ohm) {
  Hookup hookup = line_hookup(source_ohm, 1e12, load_ohm);
  SecondSource second;
  second.source = hookup.source;
  hookup.second = second;
  return hookup;
}

double gain(const Hookup& hookup, Driven driven, double dial = 10) {
  Hookup at = hookup;
  at.volume.dial = dial;
  CircuitAnalysis analysis(hookup_circuit(at, driven));
  return analysis.value(1000).real();
}

}  // namespace

TEST_CASE("Two sources in parallel: each is halved by the other, or loaded by it") {
  const Hookup hookup = two_lines(1000, 1e12);
  CHECK_THAT(gain(hookup, Driven::first), WithinRel(0.5, 1e-6));
  CHECK_THAT(gain(hookup, Driven::second), WithinRel(0.5, 1e-6));
  Hookup loaded = two_lines(1000, 500);
  CHECK_THAT(gain(loaded, Driven::first), WithinRel(0.25, 1e-6));  // 1k into 1k || 500
}

TEST_CASE("Two sources in series: each passes through the other, and they add") {
  Hookup hookup = two_lines(1000, 2000);
  hookup.selector.joined = Joined::series;
  CHECK_THAT(gain(hookup, Driven::first), WithinRel(0.5, 1e-6));  // 2k of sources into 2k
  CHECK_THAT(gain(hookup, Driven::second), WithinRel(0.5, 1e-6));
}

TEST_CASE("Out of phase reverses the second source and nothing else") {
  for (const Joined joined : {Joined::parallel, Joined::series}) {
    Hookup hookup = two_lines(1000, 3000);
    hookup.selector.joined = joined;
    const double first = gain(hookup, Driven::first);
    const double second = gain(hookup, Driven::second);
    hookup.selector.out_of_phase = true;
    CHECK(gain(hookup, Driven::first) == first);
    CHECK(gain(hookup, Driven::second) == -second);
  }
}

TEST_CASE("A selector that uses one source leaves the other out, and the take drives the one it uses") {
  Hookup hookup = two_lines(1000, 1000);
  hookup.second->source.resistance_ohm = 3000;
  hookup.selector.use = SelectorUse::first;
  CHECK(driven_source(hookup) == Driven::first);
  CHECK_THAT(gain(hookup, Driven::first), WithinRel(0.5, 1e-6));
  CHECK(gain(hookup, Driven::second) == 0);
  hookup.selector.use = SelectorUse::second;
  CHECK(driven_source(hookup) == Driven::second);
  CHECK_THAT(std::abs(HookupResponse(hookup, 10).value(1000)), WithinRel(0.25, 1e-6));
  CHECK_THAT(gain(hookup, Driven::first), WithinAbs(0, 1e-12));
  hookup.second_channel = 2;
  CHECK(driven_source(hookup) == Driven::first);
}

TEST_CASE("A linear blend gives 1 - b of one source and b of the other") {
  // Ideal sources, no load; shares 1-b and b: common practice, exact.
  Hookup hookup = two_lines(0, 1e15);
  Blend blend;
  blend.law = BlendLaw::linear;
  blend.pot.total_ohm = 250e3;
  for (const double dial : {0.0, 2.5, 5.0, 7.5, 10.0}) {
    blend.dial = dial;
    hookup.blend = blend;
    CHECK_THAT(gain(hookup, Driven::first), WithinAbs(1 - dial / 10, 1e-6));
    CHECK_THAT(gain(hookup, Driven::second), WithinAbs(dial / 10, 1e-6));
  }
}

TEST_CASE("The gangs of an MN blend are full over half the turn: 1, 1, 1, 0.5, 0 and 0, 0.5, 1, 1, 1") {
  // Common practice; the same numbers in any description of the MN law.
  Hookup hookup = two_lines(1000, 1e6);
  Blend blend;
  blend.pot.total_ohm = 500e3;
  const double first[] = {1, 1, 1, 0.5, 0};
  const double second[] = {0, 0.5, 1, 1, 1};
  for (int i = 0; i < 5; ++i) {
    blend.dial = 2.5 * i;
    hookup.blend = blend;
    const Circuit circuit = hookup_circuit(hookup);
    const std::vector<PotPlace> gangs = pots_of(circuit, {KnobKind::blend});
    REQUIRE(gangs.size() == 2);
    const auto& pots = circuit.stages[0].pots;
    CHECK_THAT(fraction_below(pots[gangs[0].pot], blend.dial), WithinAbs(first[i], 1e-12));
    CHECK_THAT(fraction_below(pots[gangs[1].pot], blend.dial), WithinAbs(second[i], 1e-12));
  }
  // At an end the source that is turned away is short-circuited at its wiper: nothing of it is left.
  blend.dial = 0;
  hookup.blend = blend;
  CHECK_THAT(gain(hookup, Driven::second), WithinAbs(0, 1e-12));
  CHECK(gain(hookup, Driven::first) > 0.99);
}

TEST_CASE("A buffer keeps what follows from loading what comes before, and multiplies by its gain") {
  Hookup hookup = line_hookup(1000, 1e12, 2000);
  Stage stage;
  stage.buffer = Buffer{9000, 0, 500, 20 * std::log10(3.0)};
  hookup.then.push_back(stage);
  // 1k into 9k, times 3, 500 ohm into 2k.
  CHECK_THAT(gain(hookup, Driven::first), WithinRel(0.9 * 3 * 0.8, 1e-6));
  // Noise: 900 ohm amplified and divided, and 500 || 2000 ohm; 4 k T R B (Nyquist 1928).
  CircuitAnalysis analysis(hookup_circuit(hookup, 10));
  CHECK_THAT(analysis.noise_resistance_ohm(1000), WithinRel(900 * 9 * 0.64 + 400, 1e-6));
}

TEST_CASE("A part that leads past a buffer is refused, one beside it is not") {
  Hookup hookup = line_hookup(1000, 10e3, 10e3);
  Stage stage;
  stage.buffer = Buffer{1e6, 0, 500, 0};
  hookup.then.push_back(stage);
  hookup.extra.push_back(extra_part(PartKind::resistor, 1e3, {"then1_output", "x"}));
  hookup.extra.push_back(extra_part(PartKind::capacitor, 1e-9, {"x", "ground"}));
  CHECK_NOTHROW(hookup_circuit(hookup));
  hookup.extra.push_back(extra_part(PartKind::resistor, 1e3, {"x", "output"}));
  CHECK_THROWS_AS(hookup_circuit(hookup), HookupError);
}

TEST_CASE("A volume pedal after the cable divides again and loads the first pot") {
  Hookup hookup = line_hookup(0, 100e3, 1e12);
  Stage pedal;
  pedal.volume = Volume{};
  pedal.volume->pot.total_ohm = 100e3;
  pedal.volume->dial = 5;
  hookup.then.push_back(pedal);
  // Both at half: 50k against 50k || 100k, then half of that.
  CHECK_THAT(gain(hookup, Driven::first, 5), WithinRel(0.4 * 0.5, 1e-6));
  CHECK(parse_knob(hookup, "pedal") == Knob{KnobKind::stage_volume, 0});
  CHECK(parse_knob(hookup, "then.0.volume") == parse_knob(hookup, "pedal"));
  // Looking back into `output` the pedal is not seen: 50k || 50k.
  CHECK_THAT(knob_table(hookup, {5}).front().output_ohm, WithinRel(25e3, 1e-6));
}

TEST_CASE("The right half of a hookup has the second gangs") {
  Hookup hookup = line_hookup(0, 100e3, 1e12);
  CHECK_FALSE(has_right_gang(hookup));
  hookup.volume.right = hookup.volume.pot;
  hookup.volume.right->taper = parse_taper("audio 15%");
  CHECK(has_right_gang(hookup));
  CHECK_THAT(gain(hookup, Driven::first, 5), WithinRel(0.5, 1e-6));
  CHECK_THAT(gain(right_half(hookup), Driven::first, 5), WithinRel(0.15, 1e-6));
}

TEST_CASE("The knob table is of any knob: a pedal's level is that of its own pot") {
  Hookup hookup = line_hookup(0, 100e3, 1e12);
  Stage pedal;
  pedal.volume = Volume{};
  pedal.volume->pot.total_ohm = 50e3;
  hookup.then.push_back(pedal);
  const std::vector<KnobRow> rows = knob_table(hookup, {0, 5, 10}, parse_knob(hookup, "pedal"));
  CHECK(std::isinf(rows[0].level_db));
  CHECK_THAT(rows[1].level_db, WithinAbs(20 * std::log10(0.5), 1e-4));  // 50k linear at half, hardly loaded
  CHECK_THAT(rows[1].element_fraction, WithinAbs(0.5, 1e-12));
  CHECK_THAT(rows[2].level_db, WithinAbs(0, 1e-4));
}
