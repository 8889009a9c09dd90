// A linear circuit over half a sample, exactly: matrix exponential and its integrals against the input's moments.
//
//   s(end) = transition s(start) + sum over p of drive[p] moment[p],
//   drive[p] = integral of exp(A (end - t)) B T_p over the half. Scaling and squaring of the Taylor series.
// Source: Van Loan, Computing integrals involving the matrix exponential, IEEE Trans. Automatic Control 23(3), 1978
// (from memory), with the powers of time carried instead of the augmented matrix.
#pragma once

#include "dsp/state_space.h"

namespace unsoldered {

struct HalfSteps {
  LongMatrix transition;    // states x states, the same for both halves
  LongMatrix first_drive;   // states x Interpolator::moments
  LongMatrix second_drive;  // states x Interpolator::moments
};

/// Both halves of one sample at `rate_hz`.
HalfSteps half_steps(const StateSpace& space, double rate_hz);

}  // namespace unsoldered
