// The circuit of a hookup: the one place where blocks of a hookup file become parts between nodes.
#pragma once

#include "dsp/hookup.h"
#include "dsp/network.h"

namespace unsoldered {

/// The network as drawn in the model, knobs at 10 (tone and extra pots at their own dials).
/// Throws InputError when extra parts leave something hanging on nothing.
Network hookup_network(const Hookup& hookup);

/// The same with the volume knob at `dial` (0..10).
Network hookup_network(const Hookup& hookup, double dial);

}  // namespace unsoldered
