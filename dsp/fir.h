// A filter given by its impulse response, which may begin before time zero.
#pragma once

#include <complex>
#include <functional>
#include <vector>

#include "dsp/interpolator.h"

namespace unsoldered {

/// out[n] = sum over k of taps[k] in[n + before - k].
struct Fir {
  std::vector<double> taps;
  int before = 0;  // taps ahead of time zero: the filter has to know that much of what comes
};

/// Response at a frequency in hertz, 0 up to half the rate; at 0 only its real part counts.
using Response = std::function<std::complex<double>(double hz)>;

/// The filter that has the response at every frequency of a fine grid (frequency sampling: Oppenheim & Schafer,
/// Discrete-Time Signal Processing), as long as it needs to be: what is cut off at either end changes the response by less
/// than 3e-4 of its least magnitude from 20 Hz to pass_band_hz(). At most about ten seconds in all; `settled` tells whether
/// that was enough.
struct SampledFir {
  Fir fir;
  bool settled = true;
};
SampledFir sample_response(const Response& response, double rate_hz);

/// One to pass_band_hz(), smoothly to nothing at half the rate.
double upper_fade(double hz, double rate_hz) noexcept;

/// Rises from 0 at x <= 0 to 1 at x >= 1 with no corner that would ring.
double smooth_step(double x) noexcept;

}  // namespace unsoldered
