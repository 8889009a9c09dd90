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

void interval_moments(const double* input, int frames, const double* weights, int taps, int moments, double* out,
                      int stride) noexcept {
  (is_wide ? wide::interval_moments : plain::interval_moments)(input, frames, weights, taps, moments, out, stride);
}

void convolve(const double* input, int frames, const double* response, int taps, double* out) noexcept {
  (is_wide ? wide::convolve : plain::convolve)(input, frames, response, taps, out);
}

void ring(const Modes& modes, const double* input, int frames, double* re, double* im, double* out) noexcept {
  (is_wide ? wide::ring : plain::ring)(modes, input, frames, re, im, out);
}

void table_rows(const double* fractions, int frames, double last_row, double* rows) noexcept {
  (is_wide ? wide::table_rows : plain::table_rows)(fractions, frames, last_row, rows);
}

void turn(const TurnInput& input, int frames, double* work, double* state, double* out) noexcept {
  (is_wide ? wide::turn : plain::turn)(input, frames, work, state, out);
}

}  // namespace unsoldered
