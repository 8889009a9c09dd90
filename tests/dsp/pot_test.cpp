// The pot as a part: mechanical travel, dead travel, end resistance, ohmmeter readings.
#include "dsp/pot.h"

#include <cmath>
#include <limits>
#include <vector>

#include "dsp/error.h"
#include "tests/catch.h"

using Catch::Matchers::ContainsSubstring;
using Catch::Matchers::WithinAbs;
using unsoldered::element_fraction;
using unsoldered::InputError;
using unsoldered::Pot;
using unsoldered::Taper;

namespace {

Pot linear_pot(double total_ohm) {
  Pot pot;
  pot.total_ohm = total_ohm;
  return pot;
}

}  // namespace

TEST_CASE("300 degrees with 15 dead at each end: electrical travel at seven positions") {
  Pot pot = linear_pot(500e3);
  pot.dead_ccw_deg = 15;
  pot.dead_cw_deg = 15;
  // Calculated: (degrees - 15)/270, held at the ends; 1e-6.
  const std::vector<std::pair<double, double>> rows = {{0, 0},          {15, 0},  {60, 0.166667}, {150, 0.5},
                                                       {240, 0.833333}, {285, 1}, {300, 1}};
  for (const auto& [deg, x] : rows) {
    CAPTURE(deg);
    const double dial = deg / 30;
    CHECK_THAT(unsoldered::degrees(pot, dial), WithinAbs(deg, 1e-9));
    CHECK_THAT(unsoldered::electrical_travel(pot, dial), WithinAbs(x, 1e-6));
  }
}

TEST_CASE("The dial is held at its ends") {
  const Pot pot = linear_pot(500e3);
  CHECK(unsoldered::degrees(pot, -1) == 0);
  CHECK(unsoldered::degrees(pot, 11) == 300);
  CHECK(unsoldered::degrees(pot, std::numeric_limits<double>::quiet_NaN()) == 0);
  CHECK(element_fraction(pot, 12) == 1);
}

TEST_CASE("End resistance sets the attenuation at 0") {
  // Common end resistances (common practice); levels calculated as 20 log10(R_end/R_total), 0.001 dB.
  const std::vector<std::vector<double>> rows = {
      {20, 500e3, -87.959}, {50, 250e3, -73.979}, {5, 10e3, -66.021}, {1e3, 100e3, -40.000}};
  for (const std::vector<double>& row : rows) {
    Pot pot = linear_pot(row[1]);
    pot.end_ohm = row[0];
    CHECK_THAT(20 * std::log10(element_fraction(pot, 0)), WithinAbs(row[2], 0.001));
    CHECK_THAT(element_fraction(pot, 10), WithinAbs(1 - row[0] / row[1], 1e-15));
    CHECK_THAT(element_fraction(pot, 5), WithinAbs(0.5, 1e-15));
  }
}

TEST_CASE("Two gangs of a 10 % and a 15 % element are 3.5218 dB apart at half travel") {
  Pot ten = linear_pot(100e3);
  ten.taper = unsoldered::parse_taper("audio 10%");
  Pot fifteen = linear_pot(100e3);
  fifteen.taper = unsoldered::parse_taper("audio 15%");
  const double difference_db = 20 * std::log10(element_fraction(fifteen, 5) / element_fraction(ten, 5));
  CHECK_THAT(difference_db, WithinAbs(3.5218, 0.001));  // 20 log10(1.5)
}

TEST_CASE("A reading at half travel comes back from the law it makes") {
  Pot pot = linear_pot(463e3);
  pot.end_ohm = 40;
  for (bool exponential : {false, true}) {
    for (double dead_deg : {0.0, 30.0}) {
      pot.dead_ccw_deg = dead_deg;  // one end only: dial 5 is then not half of the electrical travel
      pot.taper = unsoldered::law_from_half_reading(pot, 58e3, exponential);
      CAPTURE(exponential, dead_deg);
      CHECK_THAT(element_fraction(pot, 5) * pot.total_ohm, WithinAbs(58e3, 1e-6));
      CHECK_THAT(element_fraction(pot, 0) * pot.total_ohm, WithinAbs(40, 1e-6));
      const double quarter = pot.taper.share(0.25);
      CHECK(
          (exponential ? quarter < 0.06 : quarter > 0.06));  // the exponential law starts slower than straight sections
    }
  }
}

TEST_CASE("A reading that no element gives is refused") {
  Pot pot = linear_pot(463e3);
  pot.end_ohm = 40;
  for (double half_ohm : {0.0, 40.0, 463e3, 463e3 - 40, 1e6, std::numeric_limits<double>::quiet_NaN()}) {
    CHECK_THROWS_AS(unsoldered::law_from_half_reading(pot, half_ohm, false), InputError);
  }
  CHECK_THROWS_WITH(unsoldered::law_from_half_reading(pot, 1e6, false),
                    ContainsSubstring("1M") && ContainsSubstring("knob at 5"));
  pot.dead_ccw_deg = 160;
  CHECK_THROWS_WITH(unsoldered::law_from_half_reading(pot, 58e3, false), ContainsSubstring("dead travel"));
}
