#include "dsp/nodal.h"

#include <Eigen/LU>
#include <boost/math/quadrature/gauss_kronrod.hpp>
#include <cmath>
#include <limits>
#include <numbers>

#include "dsp/error.h"

namespace unsoldered {
namespace {

constexpr double boltzmann_j_per_k = 1.380649e-23;  // exact, SI since 2019

using Complex = std::complex<double>;
using Real = Eigen::MatrixXd;
using RealVector = Eigen::VectorXd;

/// One kind of part gathered into a matrix: between the unknown nodes, and towards the emf.
struct Stamp {
  Real among;
  RealVector to_emf;

  explicit Stamp(Eigen::Index size) : among(Real::Zero(size, size)), to_emf(RealVector::Zero(size)) {}

  void add(int a, int b, double admittance) {
    if (a >= 0) among(a, a) += admittance;
    if (b >= 0) among(b, b) += admittance;
    if (a >= 0 && b >= 0) {
      among(a, b) -= admittance;
      among(b, a) -= admittance;
    }
    if (a >= 0 && b == MergedNodes::is_emf) to_emf(a) -= admittance;
    if (b >= 0 && a == MergedNodes::is_emf) to_emf(b) -= admittance;
  }
};

}  // namespace

double Transfer::level_db() const noexcept { return 10 * std::log10(std::norm(value)); }

double Transfer::phase_deg() const noexcept { return std::arg(value) * 180 / std::numbers::pi; }

double Transfer::group_delay_s() const noexcept {
  if (std::norm(value) == 0) return std::numeric_limits<double>::quiet_NaN();
  return -(by_omega / value).imag();
}

double Transfer::slope() const noexcept { return std::norm(value) == 0 ? 0 : (by_omega / value).real(); }

struct NodalAnalysis::State {
  MergedNodes merged;
  int observed;
  Stamp conductance;
  Stamp capacitance;
  Stamp inverse_inductance;
  Eigen::MatrixXcd matrix;
  Eigen::VectorXcd right;
  Eigen::VectorXcd voltage;
  Eigen::VectorXcd derivative;
  Eigen::PartialPivLU<Eigen::MatrixXcd> lu;

  State(const Network& network, const std::vector<Branch>& branches)
      : merged(merge_wires(network, branches)),
        observed(merged[network.grid]),
        conductance(merged.unknowns),
        capacitance(merged.unknowns),
        inverse_inductance(merged.unknowns),
        matrix(merged.unknowns, merged.unknowns),
        right(merged.unknowns),
        voltage(merged.unknowns),
        derivative(merged.unknowns),
        lu(merged.unknowns) {
    if (observed == MergedNodes::is_loose)
      throw InputError("the network has no solution: nothing leads from the source to the grid of the load");
    for (const Branch& branch : branches) {
      const int a = merged[branch.a];
      const int b = merged[branch.b];
      if (a == b || a == MergedNodes::is_loose) continue;
      switch (branch.kind) {
        case BranchKind::resistor:
          if (branch.value > 0) conductance.add(a, b, 1 / branch.value);
          break;
        case BranchKind::capacitor:
          capacitance.add(a, b, branch.value);
          break;
        case BranchKind::inductor:
          inverse_inductance.add(a, b, 1 / branch.value);
          break;
      }
    }
  }

  void factor(double omega) {
    matrix.real() = conductance.among;
    matrix.imag() = omega * capacitance.among - (1 / omega) * inverse_inductance.among;
    lu.compute(matrix);
  }

  void require_finite(const Eigen::VectorXcd& solution, double frequency_hz) const {
    if (solution.allFinite()) return;
    throw InputError("the network has no solution at " + std::to_string(frequency_hz) +
                     " Hz: an inductor and a capacitor resonate there with no resistance to damp them; give one of "
                     "them a resistance");
  }

  void solve(double frequency_hz) {
    const double omega = 2 * std::numbers::pi * frequency_hz;
    factor(omega);
    right.real() = -conductance.to_emf;
    right.imag() = -omega * capacitance.to_emf + (1 / omega) * inverse_inductance.to_emf;
    voltage.noalias() = lu.solve(right);
    require_finite(voltage, frequency_hz);
  }

  void differentiate(double frequency_hz) {
    // Y' v + Y v' = r'  with  Y' = j (C + K / w^2)
    const double omega = 2 * std::numbers::pi * frequency_hz;
    const double inverse_square = 1 / (omega * omega);
    const Complex j(0, 1);
    right = -j * (capacitance.to_emf + inverse_square * inverse_inductance.to_emf).cast<Complex>();
    right -= j * ((capacitance.among + inverse_square * inverse_inductance.among).cast<Complex>() * voltage);
    derivative.noalias() = lu.solve(right);
  }
};

NodalAnalysis::NodalAnalysis(const Network& network) : state_(std::make_unique<State>(network, settle(network))) {}
NodalAnalysis::~NodalAnalysis() = default;
NodalAnalysis::NodalAnalysis(NodalAnalysis&&) noexcept = default;
NodalAnalysis& NodalAnalysis::operator=(NodalAnalysis&&) noexcept = default;

std::complex<double> NodalAnalysis::value(double frequency_hz) {
  if (state_->observed == MergedNodes::is_emf) return 1;
  if (state_->observed < 0) return 0;
  state_->solve(frequency_hz);
  return state_->voltage(state_->observed);
}

Transfer NodalAnalysis::transfer(double frequency_hz) {
  Transfer transfer{value(frequency_hz), 0};
  if (state_->observed < 0) return transfer;
  state_->differentiate(frequency_hz);
  transfer.by_omega = state_->derivative(state_->observed);
  return transfer;
}

std::complex<double> NodalAnalysis::impedance(double frequency_hz) {
  if (state_->observed < 0) return 0;
  state_->factor(2 * std::numbers::pi * frequency_hz);
  state_->right.setZero();
  state_->right(state_->observed) = 1;
  state_->voltage.noalias() = state_->lu.solve(state_->right);
  state_->require_finite(state_->voltage, frequency_hz);
  return state_->voltage(state_->observed);
}

Network without_load(const Network& network) {
  Network bare = network;
  std::erase_if(bare.branches, [](const Branch& branch) { return branch.after_output; });
  bare.grid = bare.output;
  return bare;
}

double johnson_noise_v(NodalAnalysis& analysis, double from_hz, double to_hz, double temperature_k) {
  // Over log f the integrand f Re Z is a few smooth humps, one a time constant or resonance.
  const auto integrand = [&](double log_f) {
    const double f = std::exp(log_f);
    return f * analysis.impedance(f).real();
  };
  const double integral = boost::math::quadrature::gauss_kronrod<double, 31>::integrate(integrand, std::log(from_hz),
                                                                                        std::log(to_hz), 12, 1e-6);
  return std::sqrt(4 * boltzmann_j_per_k * temperature_k * integral);
}

}  // namespace unsoldered
