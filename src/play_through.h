// Streams a take through a hookup: the offline counterpart of listening.
#pragma once

#include <functional>
#include <variant>
#include <vector>

#include "dsp/hookup.h"
#include "src/take.h"
#include "src/turn.h"

namespace unsoldered {

/// A knob that turns; every other stays at its own dial.
struct TurningKnob {
  Knob knob = Knob::volume;
  Turn turn;
};

/// The volume knob held at a dial position, or one or several knobs that turn.
using KnobMotion = std::variant<double, std::vector<TurningKnob>>;

/// Called for every block, planar; returns false to stop early.
using BlockSink = std::function<bool(const double* const* channels, int frames)>;

/// Frames out line up with frames in: the filter's latency is cut off the front and made up with silence at the end. Odd
/// channels go through the left gang of stereo pots, even ones through the right. Where the hookup names a channel as the
/// second source's, that channel is its emf and adds to all others; its own place is filled with the first of them (in a
/// mono take it is the emf of both).
/// Memory does not depend on the length. One thread. Throws HookupError (network without a solution), InputError (damaged
/// take, a channel it does not have), CannotError, and whatever `sink` throws. Returns the number of frames given to `sink`.
std::int64_t play_through(Take& take, const Hookup& hookup, const KnobMotion& motion, const BlockSink& sink);

}  // namespace unsoldered
