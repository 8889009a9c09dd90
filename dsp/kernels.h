// The few inner loops that take nearly all the time, compiled for the plain machine and for one with wide vectors.
// Which of the two runs is decided once, at start; results differ by rounding only. No allocation, any thread.
#pragma once

namespace unsoldered {

/// out = a + share (b - a).
void mix(const double* a, const double* b, double share, double* out, int count) noexcept;

/// See Interpolator::process. weights[p * taps + k]; taps <= 64; even moments have weights even in k, odd ones odd.
void interval_moments(const double* input, int frames, const double* weights, int taps, int moments, double* out,
                      int stride) noexcept;

/// out[n] = sum over k of response[k] input[n - k].
void convolve(const double* input, int frames, const double* response, int taps, double* out) noexcept;

/// to = transition from + drive moments: columns of `padded` numbers, moments[p * stride]. padded is a multiple of four,
/// at most 64; `to` may not be `from`.
void half_step(const double* transition, const double* drive, int states, int padded, const double* from,
               const double* moments, int moment_count, int stride, double* to) noexcept;

}  // namespace unsoldered
