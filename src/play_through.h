// Streams a take through a hookup: the offline counterpart of listening.
#pragma once

#include <functional>
#include <variant>

#include "dsp/hookup.h"
#include "src/take.h"
#include "src/turn.h"

namespace unsoldered {

/// A knob held at a dial position (the volume knob) or one that turns, the volume then at 10 unless it is the one.
struct TurningKnob {
  Knob knob = Knob::volume;
  Turn turn;
};
using KnobMotion = std::variant<double, TurningKnob>;

/// Called for every block, planar; returns false to stop early.
using BlockSink = std::function<bool(const double* const* channels, int frames)>;

/// Frames out line up with frames in: the filter's latency is cut off the front and made up with silence at the end.
/// Memory does not depend on the length. One thread. Throws HookupError (network without
/// a solution), InputError (damaged take), CannotError, and whatever `sink` throws. Returns the number of frames given to `sink`.
std::int64_t play_through(Take& take, const Hookup& hookup, const KnobMotion& motion, const BlockSink& sink);

}  // namespace unsoldered
