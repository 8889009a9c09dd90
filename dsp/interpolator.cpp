#include "dsp/interpolator.h"

#include <Eigen/LU>
#include <algorithm>
#include <boost/math/special_functions/bessel.hpp>
#include <cmath>
#include <numbers>

#include "dsp/kernels.h"

namespace unsoldered {
namespace {

constexpr double suppression_db = 120;
constexpr double pass_hz = 20000;
constexpr double least_pass = 0.4167;  // of the rate; above 48 kHz the pass band grows with the rate
constexpr double most_pass = 0.4535;   // 20 kHz at 44.1 kHz; below that the pass band shrinks with the rate

double kaiser_beta() { return 0.1102 * (suppression_db - 8.7); }

int kaiser_taps(double rate_hz) {
  const double transition = 1 - 2 * pass_band_hz(rate_hz) / rate_hz;
  const double length = (suppression_db - 7.95) / (2.285 * 2 * std::numbers::pi * transition) + 1;
  return 2 * static_cast<int>(std::ceil(length / 2));
}

double window(double t, double half_length) {
  if (std::abs(t) >= half_length) return 0;
  const double share = t / half_length;
  const double beta = kaiser_beta();
  return boost::math::cyl_bessel_i(0, beta * std::sqrt(1 - share * share)) / boost::math::cyl_bessel_i(0, beta);
}

double sinc(double t) {
  const double x = std::numbers::pi * t;
  return std::abs(x) < 1e-9 ? 1 : std::sin(x) / x;
}

/// Weights of the `taps` samples for the curve at tau 0..1 of the middle interval.
Eigen::VectorXd weights_at(double tau, int taps) {
  const double half = taps / 2.0;
  const Eigen::VectorXd distance = Eigen::VectorXd::LinSpaced(taps, tau + half - 1, tau - half);
  const Eigen::VectorXd taper = distance.unaryExpr([&](double t) { return window(t, half); });
  const Eigen::VectorXd weights = taper.cwiseProduct(distance.unaryExpr(&sinc));
  // Weights sum to one, and their first three moments about tau to nothing: the smallest change, shaped by the window.
  Eigen::Matrix<double, Eigen::Dynamic, 4> powers(taps, 4);
  for (int j = 0; j < 4; ++j) powers.col(j) = (distance / half).array().pow(j);
  const Eigen::Vector4d missing = Eigen::Vector4d::Unit(0) - powers.transpose() * weights;
  const Eigen::Matrix4d shares = powers.transpose() * taper.asDiagonal() * powers;
  return weights + taper.cwiseProduct(powers * shares.fullPivLu().solve(missing));
}

}  // namespace

double pass_band_hz(double rate_hz) noexcept { return std::clamp(pass_hz, least_pass * rate_hz, most_pass * rate_hz); }

Interpolator::Interpolator(double rate_hz) : taps_(kaiser_taps(rate_hz)) {
  constexpr int nodes = 32;
  weights_.assign(static_cast<std::size_t>(moments * taps_), 0);
  for (int node = 0; node < nodes; ++node) {
    const double angle = std::numbers::pi * (node + 0.5) / nodes;
    const Eigen::VectorXd values = weights_at((std::cos(angle) + 1) / 2, taps_);
    for (int p = 0; p < moments; ++p)
      for (int k = 0; k < taps_; ++k)
        weights_[static_cast<std::size_t>(p * taps_ + k)] +=
            values(k) * std::cos(p * angle) * (p == 0 ? 1.0 : 2.0) / nodes;
  }
}

void Interpolator::process(const double* input, int frames, double* out, int stride) const noexcept {
  interval_moments(input, frames, weights_.data(), taps_, moments, out, stride);
}

}  // namespace unsoldered
