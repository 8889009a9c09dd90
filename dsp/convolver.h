// Convolution with a long impulse response, streamed: overlap-save, the response in parts where it is very long.
//
// Source: Stockham, High-speed convolution and correlation, 1966; parts of equal length as in any text on fast convolution
// (from memory). Two blocks in a row of a channel go through one complex transform.
//
// Not for live use as it is: the answer comes latency_frames() late, thousands of frames, and the work comes in lumps of
// that size.
#pragma once

#include <memory>
#include <vector>

#include "dsp/fir.h"
#include "dsp/fourier.h"

namespace unsoldered {

/// An impulse response made ready; shared by convolvers of any thread.
class ConvolutionPlan {
 public:
  /// Setup thread. At least one tap; 0 <= before <= number of taps.
  explicit ConvolutionPlan(const Fir& fir);

  int before() const noexcept { return before_; }

 private:
  friend class Convolver;

  int before_;
  int hop_;                      // frames that one transform brings forward
  int size_;                     // of the transforms
  std::vector<Spectrum> parts_;  // of hop_ taps each when there are several
};

/// One channel.
class Convolver {
 public:
  /// Setup thread; allocates everything.
  explicit Convolver(std::shared_ptr<const ConvolutionPlan> plan);

  /// Output frame n is the answer to the input up to frame n - latency_frames(), and, where the filter begins before time
  /// zero, to the `before` frames that come next.
  int latency_frames() const noexcept;

  /// Any block size; out may be in. Neither allocates, locks nor calls the system.
  void process(const double* in, double* out, int frames);

  /// Back to silence.
  void reset() noexcept;

 private:
  void transform();
  void load(Spectrum& spectrum);

  std::shared_ptr<const ConvolutionPlan> plan_;
  Fourier fourier_;
  std::vector<double> input_;   // size frames that came before, then the two hops that are being filled
  std::vector<double> output_;  // two hops
  int filled_ = 0;              // of the two hops
  std::vector<Spectrum> past_;  // a ring, as many as parts; three for two of them
  std::size_t newest_ = 0;
  Spectrum sum_;
};

}  // namespace unsoldered
