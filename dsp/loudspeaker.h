// A guitar loudspeaker for listening: computed, generic, the copy of no real one. Never part of the numbers.
//
// Common practice, no source: such speakers have a resonance near 75 Hz below which nothing much comes, a rise of some dB
// about 3 kHz (break-up of the cone) and hardly anything above 5 kHz. Analogue prototype
//   H(s) = s^2 / (s^2 + s w1/Q1 + w1^2)               high-pass with a resonance, 75 Hz, Q1 1.2: +2.4 dB near 90 Hz
//        * (s^2 + s g w2/Q2 + w2^2) / (s^2 + s w2/Q2 + w2^2)   presence, 2.9 kHz, Q2 1.3, g = 10^(6/20): +6 dB
//        * two of w3^2 / (s^2 + s w3/Q + w3^2)         low-pass of Butterworth form, 5 kHz, Q 0.5412 and 1.3066
// Zeros: two at 0, one pair near 2.9 kHz; poles: four pairs. It leaves out the cabinet, the room and all distortion.
#pragma once

#include <complex>

#include "dsp/fir.h"

namespace unsoldered {

/// Response of the prototype, exact; about one (0 dB) in the middle, at 500 Hz.
std::complex<double> loudspeaker_response(double hz);

/// The same as a filter at any rate: exact in the pass band, then smoothly to nothing at half the rate.
Fir loudspeaker_fir(double rate_hz);

}  // namespace unsoldered
