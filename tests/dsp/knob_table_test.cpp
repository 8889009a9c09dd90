#include "dsp/knob_table.h"

#include <cmath>
#include <numbers>

#include "dsp/hookup_network.h"
#include "dsp/nodal.h"
#include "tests/catch.h"
#include "tests/dsp/example_hookups.h"

using namespace unsoldered;
using namespace unsoldered::test;
using Catch::Matchers::WithinAbs;
using Catch::Matchers::WithinRel;

TEST_CASE("Rows cover 0 to 10 and the geometry is that of the pot") {
  Hookup hookup = line_hookup(0, 500e3, 1e6);
  hookup.volume.pot.dead_ccw_deg = 15;
  hookup.volume.pot.dead_cw_deg = 15;
  hookup.volume.pot.end_ohm = 50;
  const std::vector<KnobRow> rows = knob_table(hookup, even_dials(21));
  REQUIRE(rows.size() == 21);
  CHECK(rows.front().dial == 0);
  CHECK(rows.back().dial == 10);
  CHECK_THAT(rows[10].degrees, WithinAbs(150, 1e-12));
  CHECK_THAT(rows[0].element_fraction, WithinAbs(1e-4, 1e-12));  // end resistance included
  CHECK_THAT(rows[20].element_fraction, WithinAbs(1 - 1e-4, 1e-12));
}

TEST_CASE("Peak and corner of a loaded pickup are those of the second-order low-pass in closed form") {
  // f_peak = f0 sqrt(1 - 1/(2 Q^2)), height dc Q / sqrt(1 - 1/(4 Q^2)): any filter text.
  Hookup hookup = pickup_hookup();
  hookup.source.resistance_ohm = 8000;
  hookup.source.inductance_h = 4.5;
  hookup.source.capacitance_f = 600e-12;
  hookup.source.loss_ohm.reset();
  hookup.volume.pot.total_ohm = 250e3;
  hookup.cable.reset();
  hookup.load = {1e6, 0, {}, {}};
  const double load = 200e3;
  const double l = 4.5;
  const double c = 600e-12;
  const double r = 8000;
  const double q = std::sqrt(l * c * (1 + r / load)) / (l / load + r * c);
  const double f0 = std::sqrt((1 + r / load) / (l * c)) / (2 * std::numbers::pi);
  const KnobRow row = knob_table(hookup, {10}).front();
  REQUIRE(row.peak_hz);
  CHECK_THAT(*row.peak_hz, WithinRel(f0 * std::sqrt(1 - 1 / (2 * q * q)), 1e-6));
  CHECK_THAT(*row.peak_db, WithinAbs(20 * std::log10(load / (load + r) * q / std::sqrt(1 - 1 / (4 * q * q))), 1e-6));
  CHECK_THAT(*row.treble_lost_db, WithinAbs(0, 1e-12));
  REQUIRE(row.corner_hz);
  NodalAnalysis analysis(hookup_network(hookup, 10));
  CHECK_THAT(analysis.transfer(*row.corner_hz).level_db(), WithinAbs(row.level_db - 3.0103, 1e-6));
}

TEST_CASE("What does not exist is empty: no signal, no peak, no corner") {
  const std::vector<KnobRow> rows = knob_table(line_hookup(0, 10e3, 47e3), {0, 5});
  CHECK(rows[0].level_db == -std::numeric_limits<double>::infinity());
  CHECK_FALSE(rows[0].treble_lost_db);
  CHECK_FALSE(rows[0].treble_5k_1k_db);
  CHECK(rows[0].output_ohm == 0);
  CHECK(rows[0].noise_uv == 0);
  CHECK_FALSE(rows[1].corner_hz);
  CHECK_FALSE(rows[1].peak_hz);
  CHECK_THAT(*rows[1].treble_lost_db, WithinAbs(0, 1e-9));
}

TEST_CASE("A needle of a resonance is found between the points of the scan") {
  Hookup hookup = line_hookup(1000, 1e6, 1e6);
  hookup.extra.push_back(extra_part(PartKind::inductor, 1, {"output", "ground"}));
  hookup.extra.push_back(extra_part(PartKind::capacitor, 1e-9, {"output", "ground"}));
  hookup.source.resistance_ohm = 1e9;
  hookup.volume.pot.total_ohm = 100e6;
  hookup.load.resistance_ohm = 1e9;
  const KnobRow row = knob_table(hookup, {10}).front();
  REQUIRE(row.peak_hz);
  CHECK_THAT(*row.peak_hz, WithinRel(1 / (2 * std::numbers::pi * std::sqrt(1e-9)), 1e-6));
}

TEST_CASE("Treble lost is the loss of 2-5 kHz against 200-800 Hz, other bands when asked") {
  Hookup hookup = pickup_hookup();
  const KnobRow row = knob_table(hookup, {7}).front();
  const auto mean_db = [&](double dial, double from, double to) {
    NodalAnalysis analysis(hookup_network(hookup, dial));
    double sum = 0;
    constexpr int points = 20000;
    for (int i = 0; i < points; ++i) sum += std::norm(analysis.value(from * std::pow(to / from, (i + 0.5) / points)));
    return 10 * std::log10(sum / points);
  };
  const double lost = mean_db(10, 2000, 5000) - mean_db(10, 200, 800) - mean_db(7, 2000, 5000) + mean_db(7, 200, 800);
  CHECK_THAT(*row.treble_lost_db, WithinAbs(lost, 1e-6));
  hookup.listening = Listening{{1000, 2000}, {100, 200}};
  const double other = mean_db(10, 1000, 2000) - mean_db(10, 100, 200) - mean_db(7, 1000, 2000) + mean_db(7, 100, 200);
  CHECK_THAT(*knob_table(hookup, {7}).front().treble_lost_db, WithinAbs(other, 1e-6));
}
