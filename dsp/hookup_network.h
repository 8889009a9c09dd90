// The circuit of a hookup: the one place where blocks of a hookup file become parts between nodes.
#pragma once

#include "dsp/hookup.h"
#include "dsp/network.h"

namespace unsoldered {

/// The circuit as drawn in the model, every knob at its own dial, the generator in the source that `driven` says; the other
/// source's is at rest. Throws InputError when extra parts leave something hanging on nothing, HookupError when one bridges
/// a buffer.
Circuit hookup_circuit(const Hookup& hookup, Driven driven);

/// The same for the source a take drives.
Circuit hookup_circuit(const Hookup& hookup);

/// The same with the volume knob at `dial` (0..10).
Circuit hookup_circuit(const Hookup& hookup, double dial);

/// The one network of a hookup without buffers; throws InputError when it has some.
Network hookup_network(const Hookup& hookup);
Network hookup_network(const Hookup& hookup, double dial);

}  // namespace unsoldered
