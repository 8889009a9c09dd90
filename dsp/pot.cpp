#include "dsp/pot.h"

#include <string>

#include "dsp/error.h"
#include "dsp/quantity.h"

namespace unsoldered {

double degrees(const Pot& pot, double dial) noexcept {
  const double held = !(dial > 0) ? 0.0 : dial < 10 ? dial : 10.0;
  return pot.travel_deg * held / 10;
}

double electrical_travel(const Pot& pot, double dial) noexcept {
  const double live_deg = pot.travel_deg - pot.dead_ccw_deg - pot.dead_cw_deg;
  const double x = (degrees(pot, dial) - pot.dead_ccw_deg) / live_deg;
  return !(x > 0) ? 0.0 : x < 1 ? x : 1.0;
}

double element_fraction(const Pot& pot, double dial) noexcept {
  const double share = pot.taper.share(electrical_travel(pot, dial));
  return (pot.end_ohm + share * (pot.total_ohm - 2 * pot.end_ohm)) / pot.total_ohm;
}

Taper law_from_half_reading(const Pot& pot, double half_ohm, bool exponential) {
  const double low_ohm = pot.end_ohm;
  const double high_ohm = pot.total_ohm - pot.end_ohm;
  if (!(half_ohm > low_ohm && half_ohm < high_ohm)) {
    throw InputError(format_quantity(half_ohm, Unit::ohm) + " at half travel is not between the ends of the element (" +
                     format_quantity(low_ohm, Unit::ohm) + " and " + format_quantity(high_ohm, Unit::ohm) +
                     "); read it between the bottom lug and the wiper with the knob at 5");
  }
  const double x = electrical_travel(pot, 5);
  if (!(x > 0 && x < 1)) {
    throw InputError(
        "the dead travel covers the middle of the travel, so a reading there says nothing about the law; "
        "measure elsewhere and give sections");
  }
  const TaperPoint through{x, (half_ohm - low_ohm) / (high_ohm - low_ohm)};
  return exponential ? Taper::exponential_through(through) : Taper::two_sections(through);
}

}  // namespace unsoldered
