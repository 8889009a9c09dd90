#include "dsp/exact_step.h"

#include <algorithm>
#include <cmath>

namespace unsoldered {
namespace {

constexpr int moments = Interpolator::moments;
constexpr int taylor_terms = 22;  // 0.5^22 / 22! is below the last bit of a long double

// Taylor, then doubling the time, costs about a digit for every three doublings; up to here a double has them to spare.
constexpr int most_doublings_in_double = 12;

template <typename Real>
Real binomial(int n, int k) {
  Real result = 1;
  for (int i = 1; i <= k; ++i) result = result * static_cast<Real>(n - k + i) / static_cast<Real>(i);
  return result;
}

/// Powers over the whole from powers over its halves: weights of the first and second half.
template <typename Real>
struct Halves {
  Eigen::Matrix<Real, moments, 1> first;
  Polynomials<Real> second = Polynomials<Real>::Zero();  // column q: weights of the powers j

  Halves() {
    for (int q = 0; q < moments; ++q) {
      first(q) = std::ldexp(Real(1), -q);
      for (int j = 0; j <= q; ++j) second(j, q) = binomial<Real>(q, j) * first(q);
    }
  }
};

int doublings_for(const StateSpace& space, Long span_s) {
  const Long norm = space.a.rows() == 0 ? 0 : (space.a * span_s).cwiseAbs().colwise().sum().maxCoeff();
  return std::max(0, static_cast<int>(std::ceil(std::log2(static_cast<double>(norm) + 1e-30))) + 1);
}

template <typename Real>
Step<Real> taylor_step(const StateSpace& space, Long span_s) {
  // drive.col(q) = integral over the span of exp(A (span - t)) B (t/span)^q dt
  //              = sum over k of (A span)^k span B q!/(k + q + 1)!
  const Eigen::Index states = space.a.rows();
  const Matrix<Real> scaled = (space.a * span_s).template cast<Real>();
  Step<Real> step{Matrix<Real>::Identity(states, states), Drive<Real>::Zero(states, moments)};
  Matrix<Real> term = step.transition;
  Matrix<Real> product(states, states);
  Eigen::Matrix<Real, Eigen::Dynamic, 1> vector = (space.b * span_s).template cast<Real>();
  Eigen::Matrix<Real, 1, moments> factor;
  for (int q = 0; q < moments; ++q) factor(q) = Real(1) / static_cast<Real>(q + 1);
  for (int k = 0; k < taylor_terms; ++k) {
    step.drive.noalias() += vector * factor;
    vector = (scaled.lazyProduct(vector)).eval();
    for (int q = 0; q < moments; ++q) factor(q) /= static_cast<Real>(k + q + 2);
    product.noalias() = term.lazyProduct(scaled);
    term = product / static_cast<Real>(k + 1);
    step.transition += term;
  }
  return step;
}

template <typename Real>
Step<Real> step_of(const StateSpace& space, Long span_s, int doublings) {
  Step<Real> step = taylor_step<Real>(space, std::ldexp(span_s, -doublings));
  for (int i = 0; i < doublings; ++i) step = doubled(step);
  return step;
}

}  // namespace

Step<Long> exact_step(const StateSpace& space, Long span_s) {
  return step_of<Long>(space, span_s, doublings_for(space, span_s));
}

Step<double> exact_step_in_double(const StateSpace& space, Long span_s) {
  const int doublings = doublings_for(space, span_s);
  if (doublings <= most_doublings_in_double) return step_of<double>(space, span_s, doublings);
  const Step<Long> step = step_of<Long>(space, span_s, doublings);
  return {step.transition.cast<double>(), step.drive.cast<double>()};
}

template <typename Real>
Step<Real> doubled(const Step<Real>& step) {
  static const Halves<Real> halves;
  Step<Real> whole;
  whole.drive = step.drive.lazyProduct(halves.second);
  whole.drive.noalias() += step.transition.lazyProduct(step.drive) * halves.first.asDiagonal();
  whole.transition.noalias() = step.transition.lazyProduct(step.transition);
  return whole;
}

template <typename Real>
Polynomials<Real> chebyshev_powers(Real start, Real length) {
  const Real shift = 2 * start - 1;
  Polynomials<Real> result = Polynomials<Real>::Zero();
  result(0, 0) = 1;
  result(0, 1) = shift;
  result(1, 1) = 2 * length;
  for (int p = 2; p < moments; ++p) {
    for (int q = 0; q < moments; ++q) {
      result(q, p) = 2 * shift * result(q, p - 1) - result(q, p - 2);
      if (q > 0) result(q, p) += 4 * length * result(q - 1, p - 1);
    }
  }
  return result;
}

template Step<double> doubled(const Step<double>&);
template Step<Long> doubled(const Step<Long>&);
template Polynomials<double> chebyshev_powers(double, double);
template Polynomials<Long> chebyshev_powers(Long, Long);

}  // namespace unsoldered
