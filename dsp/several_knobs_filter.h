// The sound of a hookup while several of its knobs turn at once: exact steps computed as the knobs go, no table.
//
// Not for the audio callback: it allocates, and while the knobs turn fast a second of sound takes seconds of one core. Same
// latency and stability as MovingPotFilter, which is the one for a single knob; within -60 dB, mostly -80, in a full turn
// of both in 50 ms.
#pragma once

#include <memory>
#include <vector>

#include "dsp/network.h"

namespace unsoldered {

class SeveralKnobsFilter {
 public:
  /// All other knobs stay at their dials. Throws InputError when the circuit lacks one of `knobs`, or has no solution.
  SeveralKnobsFilter(const Circuit& circuit, const std::vector<Knob>& knobs, double rate_hz, int channels);
  ~SeveralKnobsFilter();
  SeveralKnobsFilter(SeveralKnobsFilter&&) noexcept;
  SeveralKnobsFilter& operator=(SeveralKnobsFilter&&) noexcept;

  /// As MovingPotFilter's.
  int latency_frames() const noexcept;

  /// dials[k][n] (0..10) is knob k at the instant of output frame n. in[channel][frame]; out may be in.
  void process(const double* const* in, double* const* out, int frames, const double* const* dials);

 private:
  struct State;
  std::unique_ptr<State> state_;
};

}  // namespace unsoldered
