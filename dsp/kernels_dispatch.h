// The two builds of the kernels; for kernels.cpp alone.
#pragma once

#define UNSOLDERED_DECLARE_KERNELS                                                                                    \
  void mix(const double* a, const double* b, double share, double* out, int count) noexcept;                          \
  void interval_moments(const double* input, int frames, const double* weights, int taps, int moments, double* out,   \
                        int stride) noexcept;                                                                         \
  void convolve(const double* input, int frames, const double* response, int taps, double* out) noexcept;             \
  void half_step(const double* transition, const double* drive, int states, int padded, const double* from,           \
                 const double* moments, int moment_count, int stride, double* to) noexcept

namespace unsoldered::plain {
UNSOLDERED_DECLARE_KERNELS;
}
namespace unsoldered::wide {
UNSOLDERED_DECLARE_KERNELS;
}
