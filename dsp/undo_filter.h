// Takes out of a recording what it was recorded through: the filter 1 / H_rec, made finite.
//
//   P(f) = L(f) W(f) B(f) / H_rec(f)
//   L = min(1, limit / worst), worst = the largest |H_played / H_rec| over the knob positions in use
//   W = |H_rec|^2 / floor^2 where |H_rec| is under floor = -120 dB re emf, else 1; where H_rec vanishes towards 0 Hz (a coupling
//       capacitor, a piezo), W goes smoothly from 1 at 6 Hz to 0 at 1 Hz, as an inverse held there would turn by 90
//       degrees at 0 Hz and ring for ever
//   B = 1 in the pass band of the filters, then smoothly to 0 at half the rate
//
// With the exact phase of 1 / H_rec, so clips stay lined up; L, W and B turn no phase, so the filter begins a little before
// time zero. The filter that plays the take comes after it, whether its knob is held or turns.
#pragma once

#include <optional>
#include <vector>

#include "dsp/fir.h"
#include "dsp/hookup.h"

namespace unsoldered {

struct UndoFilter {
  Fir fir;
  std::vector<Band> limited;       // where L acts, inside the pass band
  std::optional<double> from_hz;   // below this it cannot be undone: H_rec vanishes towards 0 Hz
  std::vector<Band> beyond_reach;  // where H_rec is under the floor
  bool settled = true;             // false: something rings longer than ten seconds, and was cut there
};

/// Lowest frequency looked at, for the bands above.
inline constexpr double kUndoLowestHz = 1;

/// `played`: the hookup at each of the knob positions in use; may be empty. 0 <= limit_db. Empty when `recorded` is under the
/// floor over the whole pass band: nothing came through.
std::optional<UndoFilter> design_undo_filter(const Response& recorded, const std::vector<Response>& played,
                                             double limit_db, double rate_hz);

}  // namespace unsoldered
