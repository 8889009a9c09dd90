// The few inner loops that take nearly all the time, compiled for the plain machine and for one with wide vectors.
// Which of the two runs is decided once, at start; results differ by rounding only. No allocation, any thread.
#pragma once

namespace unsoldered {

/// Chebyshev moments of a sample interval, see interpolator.h.
inline constexpr int moment_count = 9;

/// Where the parts of a row of a step table lie; columns of matrices are contiguous and padded to a multiple of four.
/// Three steps of equal layout come first: knob standing, arriving rising, arriving falling.
struct RowLayout {
  int states = 0;
  int padded = 0;
  int drive = 0;   // padded x moments, inside a step; its transition, padded x states, comes before
  int step = 0;    // size of a step
  int output = 0;  // padded
  int direct = 0;  // 1
  int size = 0;    // of a row, a multiple of four
};

/// See Interpolator::process. weights[p * taps + k], taps <= 96; even moments have weights even in k, odd ones odd. Works in
/// sixteens: input and out must be readable and writable up to the next multiple of 16 frames.
void interval_moments(const double* input, int frames, const double* weights, int taps, int moments, double* out,
                      int stride) noexcept;

/// out[n] = sum over k of response[k] input[n - k].
void convolve(const double* input, int frames, const double* response, int taps, double* out) noexcept;

/// Adds the real part of `modes` complex one-pole filters, all driven by input: q' = pole q + residue input, out += Re q.
/// `modes` is a multiple of four; re and im hold q between calls, the output comes before the new input enters.
struct Modes {
  const double* pole_re;
  const double* pole_im;
  const double* residue_re;
  const double* residue_im;
  int count;
};
void ring(const Modes& modes, const double* input, int frames, double* re, double* im, double* out) noexcept;

/// rows[n]: where fractions[n] (0..1) lies among rows 0..last_row of a step table, see step_table.h.
void table_rows(const double* fractions, int frames, double last_row, double* rows) noexcept;

/// One channel of a moving-pot filter. rows[n] is the table row (its fraction: share of the next) at the end of sample n,
/// speeds[n] the knob's speed within it, -1..1 (0: standing).
/// interval_moments[p * stride + n], direct_input[n]. work: one row.
/// state[padded] is kept between calls. out[n] = output of the state at the end of sample n.
struct TurnInput {
  const double* table;
  RowLayout layout;
  const double* rows;
  const double* speeds;
  const double* interval_moments;
  int stride;
  const double* direct_input;
};
void turn(const TurnInput& input, int frames, double* work, double* state, double* out) noexcept;

}  // namespace unsoldered
