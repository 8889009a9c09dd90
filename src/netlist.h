// The circuit of a hookup as an ngspice deck, for anyone who wants to check it with a program that is not ours.
#pragma once

#include <string>

#include "dsp/hookup.h"

namespace unsoldered {

/// A complete deck: title, `Vemf emf 0 AC 1`, the parts at that dial (0..10), an AC analysis 20 Hz..20 kHz that prints level
/// and phase of v(grid). Wires are sources of 0 V, since ngspice turns a resistor of 0 ohm into one of a milliohm.
std::string netlist_text(const Hookup& hookup, double dial);

}  // namespace unsoldered
