#include "dsp/state_space.h"

#include <Eigen/Cholesky>
#include <Eigen/Eigenvalues>
#include <Eigen/LU>
#include <Eigen/QR>
#include <cmath>
#include <numbers>
#include <optional>
#include <utility>

#include "dsp/disjoint_sets.h"
#include "dsp/error.h"

namespace unsoldered {
namespace {

/// Incidence of a branch on the unknown nodes, and on the emf.
struct Incidence {
  LongVector nodes;
  Long emf = 0;
};

Incidence incidence(int unknowns, const MergedNodes::Place& a, const MergedNodes::Place& b) {
  Incidence result{LongVector::Zero(unknowns), static_cast<Long>(a.emf - b.emf)};
  if (a.index >= 0) result.nodes(a.index) += 1;
  if (b.index >= 0) result.nodes(b.index) -= 1;
  return result;
}

/// Columns: one for each group of unknown nodes that the given branches leave unconnected to ground and emf.
LongMatrix floating_groups(int unknowns, const std::vector<std::pair<int, int>>& joined) {
  DisjointSets sets(static_cast<std::size_t>(unknowns) + 1);
  const auto held = [&](int node) { return node < 0 ? unknowns : node; };
  for (const auto& [a, b] : joined) sets.join(held(a), held(b));
  std::vector<int> column(static_cast<std::size_t>(unknowns) + 1, -1);
  int count = 0;
  for (int node = 0; node < unknowns; ++node)
    if (!sets.together(node, unknowns) && column[static_cast<std::size_t>(sets.find(node))] < 0)
      column[static_cast<std::size_t>(sets.find(node))] = count++;
  LongMatrix groups = LongMatrix::Zero(unknowns, count);
  for (int node = 0; node < unknowns; ++node)
    if (!sets.together(node, unknowns)) groups(node, column[static_cast<std::size_t>(sets.find(node))]) = 1;
  return groups;
}

/// Orthonormal basis of what is orthogonal to the columns of `span`.
LongMatrix complement(const LongMatrix& span) {
  const Eigen::Index size = span.rows();
  if (span.cols() == 0) return LongMatrix::Identity(size, size);
  Eigen::ColPivHouseholderQR<LongMatrix> qr(span);
  qr.setThreshold(Long(1e-12));
  const LongMatrix q = qr.householderQ() * LongMatrix::Identity(size, size);
  return q.rightCols(size - qr.rank());
}

/// root^-T right; where there is nothing to solve Eigen would bind to nothing.
LongMatrix solve_upper(const LongMatrix& root, const LongMatrix& right) {
  if (right.size() == 0) return right;
  return root.transpose().triangularView<Eigen::Upper>().solve(right);
}

}  // namespace

/// One network of the chain.
struct StateSpaceFamily::Stage {
  /// The two sections of a moving pot.
  struct Sections {
    std::optional<Incidence> top;
    Incidence bottom;
    double total_ohm = 0;
  };

  int unknowns = 0;
  MergedNodes::Place observed;

  // Fixed resistors, and the moving pots.
  LongMatrix conductance;
  LongVector conductance_to_emf;
  std::vector<Sections> sections;

  // v = from_state s + from_input u + free z; the states' rates are -rate_from_nodes (G v + g u) + lossless part.
  LongMatrix charge_to_nodes;   // unknowns x charges
  LongVector input_to_nodes;    // unknowns
  LongMatrix free_nodes;        // unknowns x algebraic
  LongMatrix current_to_nodes;  // unknowns x fluxes: current leaving each node for a unit flux state
  LongVector input_to_flux;     // fluxes
  Eigen::Index charges = 0;
  Eigen::Index fluxes = 0;

  Stage(const Network& network, const std::vector<std::size_t>& moving);
  StateSpace solve(const std::vector<PotPosition>& positions) const;
};

StateSpaceFamily::Stage::Stage(const Network& network, const std::vector<std::size_t>& moving) {
  const std::vector<Branch> branches = settle(network, moving);
  // A moving pot counts as connected for what hangs on nothing, never as a wire.
  std::vector<Branch> connections = branches;
  for (const std::size_t number : moving) {
    const PotInNetwork& pot = network.pots[number];
    if (pot.top) connections.push_back({BranchKind::resistor, *pot.top, pot.wiper, pot.pot.total_ohm, pot.name});
    connections.push_back({BranchKind::resistor, pot.wiper, pot.bottom, pot.pot.total_ohm, pot.name});
  }
  const MergedNodes merged = merge_wires(network, connections);
  unknowns = merged.unknowns;
  observed = merged[network.grid];
  if (observed.index == MergedNodes::is_loose)
    throw InputError("the network has no solution: nothing leads from the source to the grid of the load");

  conductance = LongMatrix::Zero(unknowns, unknowns);
  conductance_to_emf = LongVector::Zero(unknowns);
  LongMatrix capacitance = LongMatrix::Zero(unknowns, unknowns);
  LongVector capacitance_to_emf = LongVector::Zero(unknowns);
  std::vector<Incidence> inductors;
  std::vector<Long> inductances;
  std::vector<std::pair<int, int>> joined_by_c;
  std::vector<std::pair<int, int>> joined_by_rc;
  std::vector<std::pair<int, int>> joined_by_rl;

  for (const Branch& branch : connections) {
    const int a = merged[branch.a].index;
    const int b = merged[branch.b].index;
    if (a == b || a == MergedNodes::is_loose || std::isinf(branch.value)) continue;
    if (branch.kind != BranchKind::inductor) joined_by_rc.emplace_back(a, b);
    if (branch.kind != BranchKind::capacitor) joined_by_rl.emplace_back(a, b);
    if (branch.kind == BranchKind::capacitor) joined_by_c.emplace_back(a, b);
  }
  for (const Branch& branch : branches) {
    const MergedNodes::Place& a = merged[branch.a];
    const MergedNodes::Place& b = merged[branch.b];
    if (a.index == b.index) continue;  // joined, or across the generator, which does not mind; or both loose
    const Incidence at = incidence(unknowns, a, b);
    const auto value = static_cast<Long>(branch.value);
    if (branch.kind == BranchKind::resistor && branch.value > 0) {
      conductance += at.nodes * at.nodes.transpose() / value;
      conductance_to_emf += at.nodes * (at.emf / value);
    } else if (branch.kind == BranchKind::capacitor) {
      capacitance += value * at.nodes * at.nodes.transpose();
      capacitance_to_emf += at.nodes * (at.emf * value);
    } else if (branch.kind == BranchKind::inductor) {
      inductors.push_back(at);
      inductances.push_back(value);
    }
  }
  for (const std::size_t number : moving) {
    const PotInNetwork& pot = network.pots[number];
    Sections of_pot{{}, incidence(unknowns, merged[pot.wiper], merged[pot.bottom]), pot.pot.total_ohm};
    if (pot.top) of_pot.top = incidence(unknowns, merged[*pot.top], merged[pot.wiper]);
    sections.push_back(std::move(of_pot));
  }

  // Voltages: across capacitors (from charge), free (from Kirchhoff's current law). Of the free ones, a group held only by
  // inductors takes its level from them, which no current in a resistor depends on.
  const LongMatrix no_capacitor = floating_groups(unknowns, joined_by_c);
  const LongMatrix only_inductors = floating_groups(unknowns, joined_by_rc);
  if (observed.index >= 0 && only_inductors.cols() > 0 && only_inductors.row(observed.index).any())
    throw InputError("the network has no solution in time: the grid of the load is held by inductors alone");
  const LongMatrix with_capacitor = complement(no_capacitor);
  free_nodes = no_capacitor * complement(no_capacitor.transpose() * only_inductors);

  const LongMatrix inner = with_capacitor.transpose() * capacitance * with_capacitor;
  const Eigen::LLT<LongMatrix> charge_root(inner);
  const LongMatrix root = charge_root.matrixL();
  // Charges that no resistor or inductor can change stay at zero.
  const LongMatrix sealed = floating_groups(unknowns, joined_by_rl);
  const LongMatrix moving_charges = complement(root.transpose() * with_capacitor.transpose() * sealed);
  charge_to_nodes = with_capacitor * solve_upper(root, moving_charges);
  input_to_nodes = -with_capacitor * charge_root.solve(with_capacitor.transpose() * capacitance_to_emf);
  charges = moving_charges.cols();

  const auto inductor_count = static_cast<Eigen::Index>(inductors.size());
  LongMatrix leaving(unknowns, inductor_count);
  LongVector inductor_emf(inductor_count);
  LongVector inductance(inductor_count);
  for (Eigen::Index k = 0; k < inductor_count; ++k) {
    leaving.col(k) = inductors[static_cast<std::size_t>(k)].nodes;
    inductor_emf(k) = inductors[static_cast<std::size_t>(k)].emf;
    inductance(k) = inductances[static_cast<std::size_t>(k)];
  }
  // Currents into a group held only by inductors add up to zero.
  const LongMatrix currents = complement(leaving.transpose() * only_inductors);
  const LongMatrix inner_inductance = currents.transpose() * inductance.asDiagonal() * currents;
  const Eigen::LLT<LongMatrix> flux_root(inner_inductance);
  const LongMatrix flux_lower = flux_root.matrixL();
  // Currents that circulate in a loop of inductors never change; what remains is orthogonal to them.
  LongMatrix drives(unknowns + 1, inductor_count);
  drives << leaving, inductor_emf.transpose();
  const LongMatrix loops = complement(drives.transpose());
  const LongMatrix moving_fluxes = complement(flux_lower.transpose() * currents.transpose() * loops);
  const LongMatrix flux_to_current = currents * solve_upper(flux_lower, moving_fluxes);
  current_to_nodes = leaving * flux_to_current;
  input_to_flux = flux_to_current.transpose() * inductor_emf;
  fluxes = moving_fluxes.cols();
}

StateSpace StateSpaceFamily::Stage::solve(const std::vector<PotPosition>& positions) const {
  LongMatrix g = conductance;
  LongVector g_emf = conductance_to_emf;
  const auto add = [&](const Incidence& at, Long ohm) {
    const Long siemens = 1 / std::max(ohm, static_cast<Long>(section_floor_ohm));
    g += siemens * at.nodes * at.nodes.transpose();
    g_emf += at.nodes * (at.emf * siemens);
  };
  for (std::size_t i = 0; i < sections.size(); ++i) {
    const Long total = sections[i].total_ohm;
    if (sections[i].top) add(*sections[i].top, (1 - static_cast<Long>(positions[i].fraction)) * total);
    if (!positions[i].open) add(sections[i].bottom, positions[i].fraction * total);
  }

  // Node voltages from states and input, the free ones by Kirchhoff's current law.
  const Eigen::Index states = charges + fluxes;
  LongMatrix nodes_from_states(unknowns, states);
  nodes_from_states << charge_to_nodes, LongMatrix::Zero(unknowns, fluxes);
  LongVector nodes_from_input = input_to_nodes;
  LongMatrix inductor_currents(unknowns, states);
  inductor_currents << LongMatrix::Zero(unknowns, charges), current_to_nodes;
  if (free_nodes.cols() > 0) {
    const Eigen::PartialPivLU<LongMatrix> kirchhoff(free_nodes.transpose() * g * free_nodes);
    const LongMatrix current = g * nodes_from_states + inductor_currents;
    const LongVector input_current = g * nodes_from_input + g_emf;
    if (states > 0) nodes_from_states -= free_nodes * kirchhoff.solve(free_nodes.transpose() * current);
    nodes_from_input -= free_nodes * kirchhoff.solve(free_nodes.transpose() * input_current);
  }
  StateSpace result;
  result.a.resize(states, states);
  result.b.resize(states);
  result.a.topRows(charges) = -charge_to_nodes.transpose() * (g * nodes_from_states + inductor_currents);
  result.b.head(charges) = -charge_to_nodes.transpose() * (g * nodes_from_input + g_emf);
  result.a.bottomRows(fluxes) = current_to_nodes.transpose() * nodes_from_states;
  result.b.tail(fluxes) = current_to_nodes.transpose() * nodes_from_input + input_to_flux;
  if (observed.index >= 0) {
    result.c = nodes_from_states.row(observed.index);
    result.d = nodes_from_input(observed.index) + observed.emf;
  } else {
    result.c = LongRow::Zero(states);
    result.d = observed.emf;
  }
  if (!result.a.allFinite() || !result.b.allFinite() || !result.c.allFinite())
    throw InputError("the network has no solution: it is singular at this position of the knob");
  return result;
}

StateSpaceFamily::StateSpaceFamily(const Circuit& circuit, std::vector<PotPlace> moving)
    : gains_(circuit.gains), moving_(std::move(moving)) {
  for (std::size_t stage = 0; stage < circuit.stages.size(); ++stage) {
    std::vector<std::size_t> pots;
    for (const PotPlace& place : moving_)
      if (place.stage == stage) pots.push_back(place.pot);
    stages_.emplace_back(circuit.stages[stage], pots);
  }
}
StateSpaceFamily::~StateSpaceFamily() = default;
StateSpaceFamily::StateSpaceFamily(StateSpaceFamily&&) noexcept = default;
StateSpaceFamily& StateSpaceFamily::operator=(StateSpaceFamily&&) noexcept = default;

int StateSpaceFamily::states() const noexcept {
  Eigen::Index states = 0;
  for (const Stage& stage : stages_) states += stage.charges + stage.fluxes;
  return static_cast<int>(states);
}

namespace {

/// `later` driven by the output of `earlier`, amplified.
StateSpace chained(const StateSpace& earlier, const StateSpace& later, Long gain) {
  const Eigen::Index n = earlier.a.rows();
  const Eigen::Index m = later.a.rows();
  StateSpace whole;
  whole.a = LongMatrix::Zero(n + m, n + m);
  whole.a.topLeftCorner(n, n) = earlier.a;
  whole.a.bottomRightCorner(m, m) = later.a;
  whole.a.bottomLeftCorner(m, n) = gain * later.b * earlier.c;
  whole.b.resize(n + m);
  whole.b << earlier.b, later.b * (gain * earlier.d);
  whole.c.resize(n + m);
  whole.c << (later.d * gain) * earlier.c, later.c;
  whole.d = later.d * gain * earlier.d;
  return whole;
}

}  // namespace

StateSpace StateSpaceFamily::at(const std::vector<PotPosition>& positions) const {
  StateSpace whole;
  for (std::size_t stage = 0; stage < stages_.size(); ++stage) {
    std::vector<PotPosition> own;
    for (std::size_t i = 0; i < moving_.size(); ++i)
      if (moving_[i].stage == stage) own.push_back(positions.at(i));
    const StateSpace one = stages_[stage].solve(own);
    whole = stage == 0 ? one : chained(whole, one, gains_[stage - 1]);
  }
  whole.c *= static_cast<Long>(gains_.back());
  whole.d *= gains_.back();
  return whole;
}

std::vector<double> natural_frequencies_hz(const Circuit& circuit) {
  const StateSpace space = StateSpaceFamily(circuit).at();
  std::vector<double> result;
  if (space.a.rows() == 0) return result;
  const Eigen::EigenSolver<Eigen::MatrixXd> solver(space.a.cast<double>(), false);
  for (const auto& eigenvalue : solver.eigenvalues()) {
    result.push_back(std::abs(eigenvalue) / (2 * std::numbers::pi));
    if (eigenvalue.imag() > 0) result.push_back(eigenvalue.imag() / (2 * std::numbers::pi));
  }
  return result;
}

}  // namespace unsoldered
