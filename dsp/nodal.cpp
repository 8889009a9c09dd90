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

  void add(const MergedNodes::Place& a, const MergedNodes::Place& b, double admittance) {
    const double emf = a.emf - b.emf;  // in the voltage from a to b, beside the two nodes'
    if (a.index >= 0) {
      among(a.index, a.index) += admittance;
      to_emf(a.index) += admittance * emf;
    }
    if (b.index >= 0) {
      among(b.index, b.index) += admittance;
      to_emf(b.index) -= admittance * emf;
    }
    if (a.index >= 0 && b.index >= 0) {
      among(a.index, b.index) -= admittance;
      among(b.index, a.index) -= admittance;
    }
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
  MergedNodes::Place observed;
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
    if (observed.index == MergedNodes::is_loose)
      throw InputError("the network has no solution: nothing leads from the source to the grid of the load");
    for (const Branch& branch : branches) {
      const MergedNodes::Place& a = merged[branch.a];
      const MergedNodes::Place& b = merged[branch.b];
      if (a.index == b.index) continue;  // joined, or across the generator, which does not mind; or both loose
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
  const MergedNodes::Place& at = state_->observed;
  if (at.index < 0) return at.emf;
  state_->solve(frequency_hz);
  return state_->voltage(at.index) + at.emf;
}

Transfer NodalAnalysis::transfer(double frequency_hz) {
  Transfer transfer{value(frequency_hz), 0};
  if (state_->observed.index < 0) return transfer;
  state_->differentiate(frequency_hz);
  transfer.by_omega = state_->derivative(state_->observed.index);
  return transfer;
}

std::complex<double> NodalAnalysis::impedance(double frequency_hz) {
  const int at = state_->observed.index;
  if (at < 0) return 0;
  state_->factor(2 * std::numbers::pi * frequency_hz);
  state_->right.setZero();
  state_->right(at) = 1;
  state_->voltage.noalias() = state_->lu.solve(state_->right);
  state_->require_finite(state_->voltage, frequency_hz);
  return state_->voltage(at);
}

CircuitAnalysis::CircuitAnalysis(const Circuit& circuit) : gains_(circuit.gains) {
  for (const Network& network : circuit.stages) stages_.emplace_back(network);
}

std::complex<double> CircuitAnalysis::value(double frequency_hz) {
  std::complex<double> result = 1;
  for (std::size_t i = 0; i < stages_.size(); ++i) result *= stages_[i].value(frequency_hz) * gains_[i];
  return result;
}

Transfer CircuitAnalysis::transfer(double frequency_hz) {
  Transfer result{1, 0};
  for (std::size_t i = 0; i < stages_.size(); ++i) {
    const Transfer stage = stages_[i].transfer(frequency_hz);
    result.by_omega = (result.by_omega * stage.value + result.value * stage.by_omega) * gains_[i];
    result.value *= stage.value * gains_[i];
  }
  return result;
}

double CircuitAnalysis::noise_resistance_ohm(double frequency_hz) {
  double result = 0;
  for (std::size_t i = 0; i < stages_.size(); ++i) {
    // What came before is amplified and passes this stage; its own resistors come on top.
    if (i > 0) result *= std::norm(gains_[i - 1] * stages_[i].value(frequency_hz));
    result += stages_[i].impedance(frequency_hz).real();
  }
  return result;
}

Network without_load(const Circuit& circuit) {
  Network bare = circuit.stages.front();
  std::erase_if(bare.branches, [](const Branch& branch) { return branch.after_output; });
  std::erase_if(bare.pots, [](const PotInNetwork& pot) { return pot.after_output; });
  bare.grid = bare.output;
  return bare;
}

double johnson_noise_v(CircuitAnalysis& analysis, double from_hz, double to_hz, double temperature_k) {
  // Over log f the integrand f Re Z is a few smooth humps, one a time constant or resonance.
  const auto integrand = [&](double log_f) {
    const double f = std::exp(log_f);
    return f * analysis.noise_resistance_ohm(f);
  };
  const double integral = boost::math::quadrature::gauss_kronrod<double, 31>::integrate(integrand, std::log(from_hz),
                                                                                        std::log(to_hz), 12, 1e-6);
  return std::sqrt(4 * boltzmann_j_per_k * temperature_k * integral);
}

}  // namespace unsoldered
