#include "dsp/state_space.h"

#include <Eigen/Eigenvalues>
#include <Eigen/LU>
#include <cmath>
#include <complex>
#include <numbers>

#include "dsp/exact_step.h"
#include "dsp/hookup_network.h"
#include "dsp/interpolator.h"
#include "dsp/nodal.h"
#include "tests/catch.h"
#include "tests/dsp/example_hookups.h"

using namespace unsoldered;
using namespace unsoldered::test;
using Catch::Matchers::WithinAbs;
using Complex = std::complex<double>;

namespace {

Complex response(const StateSpace& space, double hz) {
  const Eigen::Index states = space.a.rows();
  const auto narrow = [](const auto& matrix) { return matrix.template cast<double>().template cast<Complex>().eval(); };
  Eigen::MatrixXcd system = -narrow(space.a);
  system.diagonal().array() += Complex(0, 2 * std::numbers::pi * hz);
  const Eigen::VectorXcd state = system.partialPivLu().solve(narrow(space.b));
  return (states == 0 ? 0.0 : (narrow(space.c) * state).value()) + static_cast<double>(space.d);
}

void check_against_nodal(const Hookup& hookup, double dial) {
  const Circuit circuit = hookup_circuit(hookup, dial);
  CircuitAnalysis analysis(circuit);
  const StateSpaceFamily held(circuit);
  const StateSpaceFamily moving(circuit, pots_of(circuit, Knob::volume));
  const double fraction = element_fraction(hookup.volume.pot, dial);
  for (const double hz : {20.0, 300.0, 2000.0, 9000.0, 20000.0}) {
    const Complex wanted = analysis.value(hz);
    CHECK_THAT(std::abs(response(held.at(), hz) - wanted), WithinAbs(0, 1e-9 * (1 + std::abs(wanted))));
    // The floor of a moving section, a milliohm, is the only difference between the two.
    if (fraction > 0.001 && fraction < 0.999) {
      CHECK_THAT(std::abs(response(moving.at({{fraction}}), hz) - wanted), WithinAbs(0, 1e-9 * (1 + std::abs(wanted))));
    }
  }
}

}  // namespace

TEST_CASE("The state space has the response of nodal analysis at every dial, ends included") {
  for (const NamedHookup& example : example_hookups()) {
    for (const double dial : {0.0, 0.1, 3.0, 7.0, 9.9, 10.0}) {
      INFO(example.name << " at " << dial);
      check_against_nodal(example.hookup, dial);
    }
  }
}

TEST_CASE("The state space has the response of nodal analysis for random networks") {
  std::mt19937 random(7);
  for (int i = 0; i < 200; ++i) {
    INFO("network " << i);
    check_against_nodal(random_hookup(random), 10 * std::uniform_real_distribution<double>(0, 1)(random));
  }
}

TEST_CASE("Every position dissipates in one and the same norm, and each exact step contracts") {
  std::mt19937 random(11);
  for (int i = 0; i < 40; ++i) {
    const StateSpaceFamily family(hookup_circuit(random_hookup(random)), {{0, 0}});
    for (const double fraction : {0.0, 1e-6, 0.01, 0.3, 0.99, 1.0}) {
      INFO("network " << i << ", fraction " << fraction);
      const StateSpace space = family.at({{fraction}});
      if (space.a.rows() == 0) continue;
      const LongMatrix symmetric = space.a + space.a.transpose();
      const Eigen::SelfAdjointEigenSolver<LongMatrix> solver(symmetric, Eigen::EigenvaluesOnly);
      CHECK(solver.eigenvalues().maxCoeff() <= Long(1e-15) * space.a.norm());
      const Step<Long> step = exact_step(space, 1 / Long(48000));
      const LongMatrix product = step.transition.transpose() * step.transition;
      const Eigen::SelfAdjointEigenSolver<LongMatrix> squares(product, Eigen::EigenvaluesOnly);
      CHECK(squares.eigenvalues().maxCoeff() <= 1 + Long(1e-12));
    }
  }
}

TEST_CASE("A network without capacitors or inductors has no state") {
  CHECK(StateSpaceFamily(hookup_circuit(line_hookup(100, 10e3, 47e3)), {{0, 0}}).states() == 0);
}

TEST_CASE("A capacitor loop, a sealed charge and a cutset of inductors take no states of their own") {
  // In the drawing: source and output capacitors, coil: 3. The lattice adds two inductors in series with a resistor (one
  // current), two capacitors in series (their middle charge is sealed) and a capacitor that closes a loop.
  CHECK(StateSpaceFamily(hookup_circuit(pickup_hookup()), {{0, 0}}).states() == 3);
  CHECK(StateSpaceFamily(hookup_circuit(example_hookups().back().hookup), {{0, 0}}).states() == 4);
}

TEST_CASE("Natural frequencies of a bare pickup are its resonance 1/(2 pi sqrt(LC)), damped") {
  Hookup hookup = pickup_hookup();
  hookup.cable.reset();
  hookup.load = {1e9, 0, {}, {}};
  hookup.source.loss_ohm.reset();
  hookup.volume.pot.total_ohm = 100e6;
  const std::vector<double> natural = natural_frequencies_hz(hookup_circuit(hookup, 10));
  const double undamped = 1 / (2 * std::numbers::pi * std::sqrt(2.4 * 110e-12));
  CHECK_THAT(*std::max_element(natural.begin(), natural.end()), WithinAbs(undamped, undamped * 1e-3));
}

TEST_CASE("The step of a first-order circuit is exp(-t/RC), and its drive is that of the moments") {
  StateSpace space;
  space.a = LongMatrix::Constant(1, 1, -2 * std::numbers::pi_v<Long> * 1000);
  space.b = LongVector::Constant(1, 2 * std::numbers::pi_v<Long> * 1000);
  space.c = LongRow::Constant(1, 1);
  const Step<Long> step = exact_step(space, 1 / Long(48000));
  // Step-invariant pole of a 1 kHz low-pass at 48 kHz is 0.877305769098 (formula: Oppenheim & Schafer).
  CHECK_THAT(static_cast<double>(step.transition(0, 0)), WithinAbs(0.877305769098, 1e-11));
  const Drive<Long> drive = step.drive * chebyshev_powers<Long>(0, 1);
  // A constant input, moment 0 alone: what decay loses the drive gives.
  CHECK_THAT(static_cast<double>(step.transition(0, 0) + drive(0, 0)), WithinAbs(1, 1e-15));
  // A ramp from -1 to 1 over the sample, moment 1: the ramp-invariant form.
  const double b0 =
      0.062685119831;  // ramp-invariant low-pass, fs 48 kHz, fc 1 kHz: formula in Franklin, Powell & Workman
  const double b1 = 0.060009111071;
  CHECK_THAT(static_cast<double>(drive(0, 1)), WithinAbs(b0 - b1, 1e-11));
  // Two half spans, each with its own part of the same nine polynomials, are the whole.
  const Step<double> half = exact_step_in_double(space, 1 / Long(96000));
  const Drive<double> both =
      half.transition * half.drive * chebyshev_powers(0.0, 0.5) + half.drive * chebyshev_powers(0.5, 0.5);
  CHECK((both - drive.cast<double>()).norm() < 1e-12);
  const Step<double> twice = doubled(half);
  CHECK((twice.drive * chebyshev_powers(0.0, 1.0) - drive.cast<double>()).norm() < 1e-12);
}

TEST_CASE("The interpolated curve follows sines to 20 kHz and keeps the samples") {
  for (const double rate : {44100.0, 48000.0, 96000.0}) {
    const Interpolator interpolator(rate);
    const int taps = interpolator.taps();
    for (const double hz : {100.0, 5000.0, 19800.0}) {
      const double step = 2 * std::numbers::pi * hz / rate;
      for (const double tau : {0.0, 0.25, 0.5, 0.8, 1.0}) {
        Complex sum = 0;
        for (int p = 0; p < Interpolator::moments; ++p)
          for (int k = 0; k < taps; ++k)
            sum += interpolator.weight(p, k) * std::cos(p * std::acos(2 * tau - 1)) *
                   std::polar(1.0, step * (k - (taps / 2 - 1)));
        INFO(rate << " Hz, sine at " << hz << " Hz, tau " << tau);
        CHECK_THAT(std::abs(sum - std::polar(1.0, step * tau)), WithinAbs(0, 5e-5));
      }
    }
  }
}
