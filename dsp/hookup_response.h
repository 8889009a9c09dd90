// Response of a hookup from emf to grid at one frequency after another.
#pragma once

#include <complex>

#include "dsp/hookup.h"
#include "dsp/nodal.h"

namespace unsoldered {

/// Prepared for many frequencies. Not for sharing between threads (holds work space).
class HookupResponse {
 public:
  /// The volume at `dial`, 0..10, everything else at its own. Throws InputError when the network has no solution.
  HookupResponse(const Hookup& hookup, double dial);

  /// V(grid)/emf, frequency_hz > 0. Throws InputError where the network is singular.
  std::complex<double> value(double frequency_hz);

  /// With its derivative, for group delay and slope.
  Transfer transfer(double frequency_hz);

 private:
  CircuitAnalysis analysis_;
};

}  // namespace unsoldered
