#include "dsp/exact_step.h"

#include <algorithm>
#include <cmath>

#include "dsp/interpolator.h"

namespace unsoldered {
namespace {

constexpr int moments = Interpolator::moments;
constexpr int taylor_terms = 22;  // 0.5^22 / 22! is below the last bit of a long double

// Taylor, then doubling the time, costs about a digit for every three doublings; up to here a double has them to spare.
constexpr int most_doublings_in_double = 12;

template <typename Real>
using Polynomials = Eigen::Matrix<Real, moments, moments>;

/// Column p: coefficients, by power of theta, of T_p at 2 tau - 1 = theta + shift. theta runs 0..1 over a half sample.
template <typename Real>
Polynomials<Real> chebyshev_by_power(Real shift) {
  Polynomials<Real> result = Polynomials<Real>::Zero();
  result(0, 0) = 1;
  result(0, 1) = shift;
  result(1, 1) = 1;
  for (int p = 2; p < moments; ++p) {
    for (int q = 0; q < moments; ++q) {
      result(q, p) = 2 * shift * result(q, p - 1) - result(q, p - 2);
      if (q > 0) result(q, p) += 2 * result(q - 1, p - 1);
    }
  }
  return result;
}

template <typename Real>
Real binomial(int n, int k) {
  Real result = 1;
  for (int i = 1; i <= k; ++i) result = result * static_cast<Real>(n - k + i) / static_cast<Real>(i);
  return result;
}

/// Doubling the time: powers over the whole from powers over its first half (weights of the first and second half).
template <typename Real>
struct Doubling {
  Eigen::Matrix<Real, moments, 1> first;
  Polynomials<Real> second = Polynomials<Real>::Zero();  // column q: weights of the powers j

  Doubling() {
    for (int q = 0; q < moments; ++q) {
      first(q) = std::ldexp(Real(1), -q);
      for (int j = 0; j <= q; ++j) second(j, q) = binomial<Real>(q, j) * first(q);
    }
  }
};

template <typename Real>
HalfSteps steps_of(const StateSpace& space, Long half, int doublings) {
  using Matrix = Eigen::Matrix<Real, Eigen::Dynamic, Eigen::Dynamic>;
  using Powers = Eigen::Matrix<Real, Eigen::Dynamic, moments>;
  const Eigen::Index states = space.a.rows();
  const Long step = std::ldexp(half, -doublings);

  // powers.col(q) = integral over the step of exp(A (step - t)) B (t/step)^q dt
  //              = sum over k of (A step)^k step B q!/(k + q + 1)!
  const Matrix scaled = (space.a * step).template cast<Real>();
  Matrix transition = Matrix::Identity(states, states);
  Matrix term = transition;
  Matrix product(states, states);
  Eigen::Matrix<Real, Eigen::Dynamic, 1> vector = (space.b * step).template cast<Real>();
  Powers powers = Powers::Zero(states, moments);
  Eigen::Matrix<Real, 1, moments> factor;
  for (int q = 0; q < moments; ++q) factor(q) = Real(1) / static_cast<Real>(q + 1);
  for (int k = 0; k < taylor_terms; ++k) {
    powers.noalias() += vector * factor;
    vector = (scaled.lazyProduct(vector)).eval();
    for (int q = 0; q < moments; ++q) factor(q) /= static_cast<Real>(k + q + 2);
    product.noalias() = term.lazyProduct(scaled);
    term = product / static_cast<Real>(k + 1);
    transition += term;
  }
  const Doubling<Real> doubling;
  for (int i = 0; i < doublings; ++i) {
    const Powers late = powers.lazyProduct(doubling.second);
    powers = (transition.lazyProduct(powers) * doubling.first.asDiagonal()).eval() + late;
    product.noalias() = transition.lazyProduct(transition);
    transition.swap(product);
  }
  const Powers first = powers.lazyProduct(chebyshev_by_power<Real>(-1));
  const Powers second = powers.lazyProduct(chebyshev_by_power<Real>(0));
  return {transition.template cast<Long>(), first.template cast<Long>(), second.template cast<Long>()};
}

}  // namespace

HalfSteps half_steps(const StateSpace& space, double rate_hz) {
  const Long half = Long(0.5) / rate_hz;
  const Long norm = space.a.rows() == 0 ? 0 : (space.a * half).cwiseAbs().colwise().sum().maxCoeff();
  const int doublings = std::max(0, static_cast<int>(std::ceil(std::log2(static_cast<double>(norm) + 1e-30))) + 1);
  return doublings <= most_doublings_in_double ? steps_of<double>(space, half, doublings)
                                               : steps_of<Long>(space, half, doublings);
}

}  // namespace unsoldered
