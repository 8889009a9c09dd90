// Nodal analysis at one frequency: exact response, group delay, impedance and thermal noise of a settled network.
//
//   (G + jwC + 1/(jw) K) v = -y_emf,   H = v(grid);   K = sum of a a^T / L.
// Method: any circuit text, e.g. Vlach & Singhal, Computer Methods for Circuit Analysis and Design (from memory).
// Short-circuited nodes are merged and open parts left out beforehand, so dial 0 and 10 need no special case.
#pragma once

#include <complex>
#include <memory>
#include <vector>

#include "dsp/network.h"

namespace unsoldered {

/// Transfer from the emf and its derivative by angular frequency.
struct Transfer {
  std::complex<double> value;     // V(observed)/emf
  std::complex<double> by_omega;  // d value / d omega, seconds

  double level_db() const noexcept;       // 20 log10 |H|; -inf for no signal
  double phase_deg() const noexcept;      // -180..180
  double group_delay_s() const noexcept;  // -d phase / d omega; NaN where there is no signal
  double slope() const noexcept;          // d ln|H| / d omega
};

/// A network at fixed knob positions, prepared for many frequencies. Not for sharing between threads (holds work space).
class NodalAnalysis {
 public:
  /// Observes the grid. Throws InputError when the emf is short-circuited.
  explicit NodalAnalysis(const Network& network);
  ~NodalAnalysis();
  NodalAnalysis(NodalAnalysis&&) noexcept;
  NodalAnalysis& operator=(NodalAnalysis&&) noexcept;

  /// Throws InputError when the network is singular at this frequency (an undamped resonance); frequency_hz > 0.
  Transfer transfer(double frequency_hz);

  /// Transfer without the derivative, cheaper.
  std::complex<double> value(double frequency_hz);

  /// Impedance from the grid to ground with the emf at rest, ohm.
  std::complex<double> impedance(double frequency_hz);

 private:
  struct State;
  std::unique_ptr<State> state_;
};

/// The same for a chain of networks.
class CircuitAnalysis {
 public:
  /// Throws as NodalAnalysis does.
  explicit CircuitAnalysis(const Circuit& circuit);

  Transfer transfer(double frequency_hz);
  std::complex<double> value(double frequency_hz);

  /// The resistor whose thermal noise is that at the last grid, ohm; amplifiers add none.
  double noise_resistance_ohm(double frequency_hz);

 private:
  std::vector<NodalAnalysis> stages_;
  std::vector<double> gains_;
};

/// The circuit seen back into `output`, with cable, further stages and load removed, for NodalAnalysis::impedance.
Network without_load(const Circuit& circuit);

/// Johnson noise at the grid, V rms, from_hz..to_hz, all resistors at temperature_k.
/// e^2 = 4 k T integral Re Z df (Nyquist 1928; k exact in the SI).
double johnson_noise_v(CircuitAnalysis& analysis, double from_hz, double to_hz, double temperature_k);

}  // namespace unsoldered
