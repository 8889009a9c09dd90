// The curve between the samples of a take: a Kaiser-windowed sinc, written as Chebyshev moments of every sample interval.
//
// Between two samples the band-limited curve is so smooth that nine Chebyshev polynomials carry it to -120 dB. Those
// nine numbers an interval are the same for every circuit and knob position, so they are computed once and shared.
// Sources: Kaiser's window and length formulas as in Oppenheim & Schafer, Discrete-Time Signal Processing; Chebyshev
// series as in any numerical text.
//
// Pass band: to 20 kHz, but at least 0.4167 and at most 0.4535 of the rate; images from rate minus that upward are
// suppressed by 120 dB. Content between the two edges is carried in part. Sample instants are exact.
//
// Cubics are followed exactly, so the images of what changes slowly vanish: a circuit that passes the images but hardly the
// lowest frequencies themselves (a small capacitor straight to the output) would show them. Condition on the moments of the
// kernel: Strang and Fix, A Fourier analysis of the finite element variational method, 1971 (from memory).
#pragma once

#include <vector>

#include "dsp/kernels.h"

namespace unsoldered {

/// Upper edge of what the curve carries whole: 20 kHz, but at least 0.4167 and at most 0.4535 of the rate.
double pass_band_hz(double rate_hz) noexcept;

class Interpolator {
 public:
  static constexpr int moments = moment_count;

  explicit Interpolator(double rate_hz);

  /// Samples that one interval depends on; even.
  int taps() const noexcept { return taps_; }

  /// An interval is known once this many samples after its end have come.
  int latency() const noexcept { return taps_ / 2 - 1; }

  /// Weight of sample k (0 oldest .. taps-1) in moment p of the interval between samples taps/2-1 and taps/2.
  /// The curve at tau (0..1) is the sum over p of moment p times T_p(2 tau - 1).
  double weight(int p, int k) const noexcept { return weights_[static_cast<std::size_t>(p * taps_ + k)]; }

  /// Moments of the `frames` intervals that end latency() samples before each of input[0..frames-1]; input[-taps+1..] must
  /// be readable. out[p * stride + n]. Both are used up to the next multiple of 16 frames. Audio thread.
  void process(const double* input, int frames, double* out, int stride) const noexcept;

 private:
  int taps_;
  std::vector<double> weights_;
};

}  // namespace unsoldered
