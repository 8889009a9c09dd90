// The two builds of the kernels; for kernels*.cpp alone.
#pragma once

#include "dsp/kernels.h"

#define UNSOLDERED_DECLARE_KERNELS                                                                                  \
  void interval_moments(const double* input, int frames, const double* weights, int taps, int moments, double* out, \
                        int stride) noexcept;                                                                       \
  void convolve(const double* input, int frames, const double* response, int taps, double* out) noexcept;           \
  void ring(const Modes& modes, const double* input, int frames, double* re, double* im, double* out) noexcept;     \
  void table_rows(const double* fractions, int frames, double last_row, double* rows) noexcept;                     \
  void turn(const TurnInput& input, int frames, double* work, double* state, double* out) noexcept

namespace unsoldered::plain {
UNSOLDERED_DECLARE_KERNELS;
}
namespace unsoldered::wide {
UNSOLDERED_DECLARE_KERNELS;
}
