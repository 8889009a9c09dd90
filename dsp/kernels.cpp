#include "dsp/kernels.h"

#include "dsp/kernels_dispatch.h"

namespace unsoldered {
namespace {

bool machine_is_wide() noexcept {
#if defined(UNSOLDERED_WIDE_KERNELS)
  return __builtin_cpu_supports("avx2") != 0 && __builtin_cpu_supports("fma") != 0;
#else
  return false;
#endif
}

const bool is_wide = machine_is_wide();

}  // namespace

void mix(const double* a, const double* b, double share, double* out, int count) noexcept {
  (is_wide ? wide::mix : plain::mix)(a, b, share, out, count);
}

void interval_moments(const double* input, int frames, const double* weights, int taps, int moments, double* out,
                      int stride) noexcept {
  (is_wide ? wide::interval_moments : plain::interval_moments)(input, frames, weights, taps, moments, out, stride);
}

void convolve(const double* input, int frames, const double* response, int taps, double* out) noexcept {
  (is_wide ? wide::convolve : plain::convolve)(input, frames, response, taps, out);
}

void half_step(const double* transition, const double* drive, int states, int padded, const double* from,
               const double* moments, int moment_count, int stride, double* to) noexcept {
  (is_wide ? wide::half_step : plain::half_step)(transition, drive, states, padded, from, moments, moment_count, stride,
                                                 to);
}

}  // namespace unsoldered
