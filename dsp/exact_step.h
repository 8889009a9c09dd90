// A linear circuit over a span of time, exactly: matrix exponential and its integrals against the input's powers.
//
//   s(end) = transition s(start) + sum over q of drive.col(q) u_q,   u(theta) = sum of u_q theta^q, theta 0..1 over the span,
//   drive.col(q) = integral of exp(A (end - t)) B theta^q dt. Scaling and squaring of the Taylor series.
// Source: Van Loan, Computing integrals involving the matrix exponential, IEEE Trans. Automatic Control 23(3), 1978
// (from memory), with the powers of time carried instead of the augmented matrix.
#pragma once

#include "dsp/interpolator.h"
#include "dsp/state_space.h"

namespace unsoldered {

template <typename Real>
using Matrix = Eigen::Matrix<Real, Eigen::Dynamic, Eigen::Dynamic>;
/// One column for each power (or Chebyshev polynomial) of the input.
template <typename Real>
using Drive = Eigen::Matrix<Real, Eigen::Dynamic, Interpolator::moments>;
/// Column p: by power of theta, the Chebyshev polynomial T_p(2 tau - 1) at tau = start + length theta.
template <typename Real>
using Polynomials = Eigen::Matrix<Real, Interpolator::moments, Interpolator::moments>;

template <typename Real>
struct Step {
  Matrix<Real> transition;
  Drive<Real> drive;
};

/// The step over `span_s` seconds.
Step<Long> exact_step(const StateSpace& space, Long span_s);

/// The same to double precision, in double where that is enough and several times faster.
Step<double> exact_step_in_double(const StateSpace& space, Long span_s);

/// The step over twice the span.
template <typename Real>
Step<Real> doubled(const Step<Real>& step);

/// drive * chebyshev_powers(start, length) answers to an interval's Chebyshev moments instead of to powers of theta.
template <typename Real>
Polynomials<Real> chebyshev_powers(Real start, Real length);

}  // namespace unsoldered
