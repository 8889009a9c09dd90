// A circuit as s' = A s + B u, y = c s + d u, with u the emf, y the voltage at the grid and s in energy variables.
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

/// Where a moving pot stands.
struct PotPosition {
  double fraction = 0;  // RB/RT, 0..1
  bool open = false;    // the section below the wiper is disconnected (a no-load pot at 10)
};

/// All positions of some pots (or of none) of a circuit, in one set of states. The states of a chain are those of its
/// networks one after the other; each network dissipates in its own norm, and none drives one before it, so that no motion
/// of the pots can make the chain unstable.
class StateSpaceFamily {
 public:
  /// The pots in `moving` are left free, their sections floored so that the states stay the same; everything else is at its
  /// dial. Throws InputError when a network has no solution.
  explicit StateSpaceFamily(const Circuit& circuit, std::vector<PotPlace> moving = {});

  ~StateSpaceFamily();
  StateSpaceFamily(StateSpaceFamily&&) noexcept;
  StateSpaceFamily& operator=(StateSpaceFamily&&) noexcept;

  int states() const noexcept;

  /// Of the moving pots in their order.
  StateSpace at(const std::vector<PotPosition>& positions = {}) const;

 private:
  struct Stage;
  std::vector<Stage> stages_;
  std::vector<double> gains_;
  std::vector<PotPlace> moving_;
};

/// Smallest section of a moving pot in the time path, ohm: -140 dB of a 10k element, below any end resistance met.
constexpr double section_floor_ohm = 1e-3;

/// |eigenvalue| / 2 pi and |imaginary part| / 2 pi of every natural mode, Hz: where corners and resonances lie.
std::vector<double> natural_frequencies_hz(const Circuit& circuit);

}  // namespace unsoldered
