// The sound of a hookup while several of its knobs turn at once: exact steps computed for each sample, no table.
//
// Not for the audio callback: it allocates, and a second of sound takes about a second or two of one core. Same accuracy,
// latency and stability as MovingPotFilter, which is the one for a single knob.
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
