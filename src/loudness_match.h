// Brings clips to one loudness by gain alone.
#pragma once

#include <vector>

#include "src/loudness.h"

namespace unsoldered {

struct MatchedGain {
  double gain = 1;
  bool left_out = false;  // nothing above the gate: there is no loudness to match
};

/// The highest loudness that keeps every true peak at `ceiling` or below, and the gain that gives it to each clip. A clip
/// that is left out keeps its level, or is lowered to the ceiling.
std::vector<MatchedGain> match_loudness(const std::vector<const Loudness*>& clips, double ceiling);

}  // namespace unsoldered
