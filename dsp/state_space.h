// A network as s' = A s + B u, y = c s + d u, with u the emf, y the voltage at the grid and s in energy variables.
//
// States are charges and fluxes scaled so that |s|^2 / 2 is the stored energy in joules. L and C do not depend on any
// knob, so every knob position dissipates in the same norm: A + A^T <= 0. Reduced beforehand, from the shape of the
// network alone: capacitor loops and capacitors in series (through charge: the input is never differentiated), nodes
// without capacitors, cutsets of inductors, charges and fluxes that can never change.
// Source: charge/flux formulation of RLC networks, e.g. Anderson & Vongpanitlerd, Network Analysis and Synthesis
// (from memory).
//
// Long double: sections of a pot near its ends are ten decades below its total, and the small parts must survive them.
#pragma once

#include <Eigen/Core>
#include <memory>
#include <optional>
#include <vector>

#include "dsp/network.h"

namespace unsoldered {

using Long = long double;
using LongMatrix = Eigen::Matrix<Long, Eigen::Dynamic, Eigen::Dynamic>;
using LongVector = Eigen::Matrix<Long, Eigen::Dynamic, 1>;
using LongRow = Eigen::Matrix<Long, 1, Eigen::Dynamic>;

struct StateSpace {
  LongMatrix a;  // 1/s
  LongVector b;
  LongRow c;
  Long d = 0;
};

/// All positions of one pot (or of none) of a network, in one set of states.
class StateSpaceFamily {
 public:
  /// Everything at its dial. Throws InputError when the network has no solution.
  explicit StateSpaceFamily(const Network& network) : StateSpaceFamily(network, std::nullopt) {}

  /// The pot number `moving` of network.pots is left free, its sections floored so that the states stay the same.
  StateSpaceFamily(const Network& network, std::optional<std::size_t> moving);

  ~StateSpaceFamily();
  StateSpaceFamily(StateSpaceFamily&&) noexcept;
  StateSpaceFamily& operator=(StateSpaceFamily&&) noexcept;

  int states() const noexcept;

  /// At an element fraction RB/RT of the moving pot, 0..1; any number when none moves.
  StateSpace at(double fraction) const;

  /// With the moving rheostat's section disconnected (a no-load pot at 10).
  StateSpace disconnected() const;

 private:
  struct State;
  std::unique_ptr<State> state_;
};

/// Smallest section of a moving pot in the time path, ohm: -140 dB of a 10k element, below any end resistance met.
constexpr double section_floor_ohm = 1e-3;

/// |eigenvalue| / 2 pi and |imaginary part| / 2 pi of every natural mode, Hz: where corners and resonances lie.
std::vector<double> natural_frequencies_hz(const Network& network);

}  // namespace unsoldered
