#include "dsp/exact_step.h"

#include <algorithm>
#include <cmath>

#include "dsp/interpolator.h"

namespace unsoldered {
namespace {

constexpr int moments = Interpolator::moments;
constexpr int taylor_terms = 22;  // 0.5^22 / 22! is below the last bit of a long double

using Polynomials = Eigen::Matrix<Long, moments, moments>;

/// Column p: coefficients, by power of theta, of T_p at 2 tau - 1 = theta + shift. theta runs 0..1 over a half sample.
Polynomials chebyshev_by_power(Long shift) {
  Polynomials result = Polynomials::Zero();
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

Long binomial(int n, int k) {
  Long result = 1;
  for (int i = 1; i <= k; ++i) result = result * (n - k + i) / i;
  return result;
}

/// Doubling the time: powers over the whole from powers over its first half (weights of the first and second half).
struct Doubling {
  LongVector first = LongVector(moments);
  Polynomials second = Polynomials::Zero();  // column q: weights of the powers j

  Doubling() {
    for (int q = 0; q < moments; ++q) {
      first(q) = std::pow(Long(0.5), q);
      for (int j = 0; j <= q; ++j) second(j, q) = binomial(q, j) * first(q);
    }
  }
};

}  // namespace

HalfSteps half_steps(const StateSpace& space, double rate_hz) {
  const Eigen::Index states = space.a.rows();
  const Long half = Long(0.5) / rate_hz;
  const Long norm = states == 0 ? 0 : (space.a * half).cwiseAbs().colwise().sum().maxCoeff();
  const int doublings = std::max(0, static_cast<int>(std::ceil(std::log2(static_cast<double>(norm) + 1e-30))) + 1);
  const Long step = half * std::pow(Long(0.5), doublings);

  // powers.col(q) = integral over the step of exp(A (step - t)) B (t/step)^q dt
  //              = sum over k of (A step)^k step B q!/(k + q + 1)!
  const LongMatrix scaled = space.a * step;
  LongMatrix transition = LongMatrix::Identity(states, states);
  LongMatrix term = transition;
  LongVector vector = space.b * step;
  LongMatrix powers = LongMatrix::Zero(states, moments);
  Eigen::Matrix<Long, 1, moments> factor;
  for (int q = 0; q < moments; ++q) factor(q) = Long(1) / (q + 1);
  for (int k = 0; k < taylor_terms; ++k) {
    powers += vector * factor;
    vector = scaled * vector;
    for (int q = 0; q < moments; ++q) factor(q) /= k + q + 2;
    term = term * scaled / Long(k + 1);
    transition += term;
  }
  const Doubling doubling;
  for (int i = 0; i < doublings; ++i) {
    powers = (transition * powers * doubling.first.asDiagonal() + powers * doubling.second).eval();
    transition = (transition * transition).eval();
  }
  static_assert(moments >= 2);
  return {transition, powers * chebyshev_by_power(-1), powers * chebyshev_by_power(0)};
}

}  // namespace unsoldered
