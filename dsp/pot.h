// A pot as a part: total resistance, law, mechanical travel, dead travel, end resistance.
//
//   RB = R_end + r(x) (RT - 2 R_end),  RA = RT - RB,
//   x = (degrees - dead1)/(travel - dead1 - dead2), held at the ends;  degrees = travel * dial / 10.
#pragma once

#include <optional>

#include "dsp/taper.h"

namespace unsoldered {

struct Pot {
  double total_ohm = 0;
  Taper taper;
  double travel_deg = 300;
  double dead_ccw_deg = 0;  // at the counter-clockwise end, where the dial reads 0
  double dead_cw_deg = 0;   // at the clockwise end, where the dial reads 10
  double end_ohm = 0;
  std::optional<double> tolerance;  // 0.2 = 20 %
};

/// Mechanical position in degrees; dial 0..10, held at the ends (a NaN counts as 0).
double degrees(const Pot& pot, double dial) noexcept;

/// Electrical travel x, 0..1.
double electrical_travel(const Pot& pot, double dial) noexcept;

/// RB / RT, end resistance included: the share of the total below the wiper. Safe in the audio callback.
double element_fraction(const Pot& pot, double dial) noexcept;

/// The law that an ohmmeter reading between bottom lug and wiper at dial 5 implies: two straight sections through it,
/// or, with `exponential`, the exponential law. Uses the total, the travel and the end resistance of `pot`, not its
/// taper. Throws InputError when the reading does not lie between the ends of the element, or dial 5 lies in dead
/// travel.
Taper law_from_half_reading(const Pot& pot, double half_ohm, bool exponential);

}  // namespace unsoldered
