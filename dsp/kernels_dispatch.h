// The two builds of the kernels; for kernels*.cpp alone.
#pragma once

#include "dsp/kernels.h"

#define UNSOLDERED_DECLARE_KERNELS                                                                                  \
  void interval_moments(const double* input, int frames, const double* weights, int taps, int moments, double* out, \
                        int stride) noexcept;                                                                       \
  void convolve(const double* input, int frames, const double* response, int taps, double* out) noexcept;           \
  void ring(const Modes& modes, const double* input, int frames, double* re, double* im, double* out) noexcept;     \
  void table_rows(const double* fractions, int frames, double last_row, double* rows) noexcept;                     \
  void turn(const TurnInput& input, int frames, double* work, double* state, double* out) noexcept;                 \
  bool fourier(const FourierTables& tables, double* re, double* im, double* other_re, double* other_im) noexcept;   \
  void between_hops(const double* older_re, const double* older_im, const double* newer_re, const double* newer_im, \
                    int size, double* re, double* im) noexcept;                                                     \
  void multiply_add(const double* a_re, const double* a_im, const double* b_re, const double* b_im, int count,      \
                    double* re, double* im) noexcept

namespace unsoldered::plain {
UNSOLDERED_DECLARE_KERNELS;
}
namespace unsoldered::wide {
UNSOLDERED_DECLARE_KERNELS;
}
