#include "dsp/nodal.h"

#include <cmath>
#include <numbers>

#include "dsp/error.h"
#include "dsp/hookup_network.h"
#include "tests/catch.h"
#include "tests/dsp/example_hookups.h"

using namespace unsoldered;
using namespace unsoldered::test;
using Catch::Matchers::WithinAbs;
using Catch::Matchers::WithinRel;

namespace {

NodalAnalysis at(const Hookup& hookup, double dial) { return NodalAnalysis(hookup_network(hookup, dial)); }

double level_db(const Hookup& hookup, double dial, double hz) { return at(hookup, dial).transfer(hz).level_db(); }

}  // namespace

TEST_CASE("A 500k linear pot at half into 1M is -7.0437 dB, in closed form RB RL / (RT RL + RT RB - RB^2)") {
  // Kirchhoff; Horowitz & Hill, The Art of Electronics, gives the loaded divider.
  CHECK_THAT(level_db(line_hookup(0, 500e3, 1e6), 5, 1000), WithinAbs(-7.0437, 0.0001));
  for (const double dial : {0.5, 2.0, 5.0, 9.5, 10.0}) {
    const double rb = 500e3 * dial / 10;
    const double ratio = rb * 1e6 / (500e3 * 1e6 + 500e3 * rb - rb * rb);
    CHECK_THAT(level_db(line_hookup(0, 500e3, 1e6), dial, 1000), WithinAbs(20 * std::log10(ratio), 1e-9));
  }
}

TEST_CASE("A first-order low-pass is 3.0103 dB down and 45 degrees late at 1/(2 pi R C)") {
  Hookup hookup = line_hookup(0, 500e3, 1e9);
  hookup.cable = Cable{500e-12, {}};
  const double r = 1 / (2 / 250e3 + 1 / 1e9);
  const double corner = 1 / (2 * std::numbers::pi * r * 500e-12);
  const double dc = level_db(hookup, 5, 1e-3);
  const Transfer transfer = at(hookup, 5).transfer(corner);
  CHECK_THAT(transfer.level_db() - dc, WithinAbs(-3.0103, 0.00005));
  CHECK_THAT(transfer.phase_deg(), WithinAbs(-45, 1e-6));
  // tau = RC / (1 + (w RC)^2)
  CHECK_THAT(transfer.group_delay_s(), WithinRel(r * 500e-12 / 2, 1e-9));
}

TEST_CASE("Group delay is the derivative of the phase, for every kind of hookup") {
  for (const NamedHookup& example : example_hookups()) {
    for (const double dial : {0.3, 5.0, 10.0}) {
      for (const double hz : {50.0, 700.0, 4000.0, 15000.0}) {
        INFO(example.name << " at " << dial << ", " << hz << " Hz");
        NodalAnalysis analysis = at(example.hookup, dial);
        const double step = hz * 1e-5;
        const std::complex<double> ratio = analysis.value(hz + step) / analysis.value(hz - step);
        const double numeric = -std::arg(ratio) / (2 * std::numbers::pi * 2 * step);
        CHECK_THAT(analysis.transfer(hz).group_delay_s(), WithinAbs(numeric, 1e-10 + 1e-5 * std::abs(numeric)));
      }
    }
  }
}

TEST_CASE("At dial 0 without end resistance there is no signal, and nothing is NaN but what does not exist") {
  for (const NamedHookup& example : example_hookups()) {
    if (example.name == "lattice" || example.name == "source on the wiper") continue;
    INFO(example.name);
    const Transfer transfer = at(example.hookup, 0).transfer(1000);
    CHECK(transfer.level_db() == -std::numeric_limits<double>::infinity());
    CHECK(transfer.value == 0.0);
  }
}

TEST_CASE("An ideal generator across a wire has no solution and says so") {
  Hookup hookup = line_hookup(0, 10e3, 47e3);
  hookup.volume.source_on = SourceOn::wiper;
  CHECK_NOTHROW(at(hookup, 1));
  CHECK_THROWS_WITH(at(hookup, 0), Catch::Matchers::ContainsSubstring("short-circuited"));
}

TEST_CASE("An undamped resonance across an ideal generator is refused at its frequency, not answered") {
  Hookup hookup = line_hookup(0, 10e3, 47e3);
  hookup.extra.push_back(extra_part(PartKind::inductor, 1, {"emf", "x"}));
  hookup.extra.push_back(extra_part(PartKind::capacitor, 1, {"x", "ground"}));
  NodalAnalysis analysis = at(hookup, 5);
  CHECK_THROWS_AS(analysis.value(1 / (2 * std::numbers::pi)), InputError);
  CHECK_NOTHROW(analysis.value(1));
}

TEST_CASE("A part that hangs on nothing is refused by the name of its node") {
  Hookup hookup = pickup_hookup();
  hookup.extra.push_back(extra_part(PartKind::resistor, 1e3, {"lost", "found"}));
  CHECK_THROWS_WITH(hookup_network(hookup), Catch::Matchers::ContainsSubstring("\"lost\""));
}

TEST_CASE("Johnson noise of 125k with 500 pF, 20 Hz to 20 kHz, is 2.75220 uV at 300 K") {
  // Nyquist 1928; the value calculated from 4 k T R and the first-order band limits.
  Hookup hookup = line_hookup(0, 500e3, 1e12);
  hookup.cable = Cable{500e-12, {}};
  CircuitAnalysis analysis(hookup_circuit(hookup, 5));
  CHECK_THAT(1e6 * johnson_noise_v(analysis, 20, 20000, 300), WithinRel(2.75220, 1e-5));
}

TEST_CASE("Looking back into the output, a pot at half is a quarter of its total") {
  Hookup hookup = line_hookup(0, 500e3, 10e3);
  hookup.cable = Cable{1e-9, {}};
  hookup.load.coupling_f = 22e-9;
  NodalAnalysis analysis(without_load(hookup_circuit(hookup, 5)));
  CHECK_THAT(std::abs(analysis.impedance(1000)), WithinRel(125e3, 1e-12));
}

TEST_CASE("Halving every R and L and doubling every C leaves the response unchanged") {
  Hookup halved = example_hookups()[1].hookup;
  const Hookup original = halved;
  for (double* value : {&halved.source.resistance_ohm, &halved.source.inductance_h, &*halved.source.loss_ohm,
                        &halved.volume.pot.total_ohm, &halved.tone->pot.total_ohm, &halved.load.resistance_ohm,
                        &*halved.treble_bleed->parallel_ohm})
    *value /= 2;
  for (double* value : {&*halved.source.capacitance_f, &halved.cable->capacitance_f, &halved.tone->capacitor_f,
                        &halved.treble_bleed->capacitor_f, &halved.load.capacitance_f, &*halved.load.coupling_f})
    *value *= 2;
  for (const double hz : {20.0, 1000.0, 5000.0, 20000.0})
    CHECK_THAT(level_db(halved, 6, hz), WithinAbs(level_db(original, 6, hz), 1e-9));
}
