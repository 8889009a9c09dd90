#include "dsp/state_space.h"

#include <Eigen/Cholesky>
#include <Eigen/Eigenvalues>
#include <Eigen/LU>
#include <Eigen/QR>
#include <cmath>
#include <numbers>

#include "dsp/disjoint_sets.h"
#include "dsp/error.h"

namespace unsoldered {
namespace {

/// Incidence of a branch on the unknown nodes, and on the emf.
struct Incidence {
  LongVector nodes;
  Long emf = 0;
};

Incidence incidence(int unknowns, int a, int b) {
  Incidence result{LongVector::Zero(unknowns), 0};
  if (a >= 0) result.nodes(a) += 1;
  if (b >= 0) result.nodes(b) -= 1;
  if (a == MergedNodes::is_emf) result.emf += 1;
  if (b == MergedNodes::is_emf) result.emf -= 1;
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

}  // namespace

struct StateSpaceFamily::State {
  int unknowns = 0;
  int observed = 0;

  // Fixed resistors, and the two sections of the moving pot.
  LongMatrix conductance;
  LongVector conductance_to_emf;
  std::optional<Incidence> top_section;
  std::optional<Incidence> bottom_section;
  double total_ohm = 0;

  // v = from_state s + from_input u + free z; the states' rates are -rate_from_nodes (G v + g u) + lossless part.
  LongMatrix charge_to_nodes;   // unknowns x charges
  LongVector input_to_nodes;    // unknowns
  LongMatrix free_nodes;        // unknowns x algebraic
  LongMatrix current_to_nodes;  // unknowns x fluxes: current leaving each node for a unit flux state
  LongVector input_to_flux;     // fluxes
  Eigen::Index charges = 0;
  Eigen::Index fluxes = 0;

  State(const Network& network, std::optional<std::size_t> moving);
  StateSpace solve(Long top_siemens, Long bottom_siemens) const;
};

StateSpaceFamily::State::State(const Network& network, std::optional<std::size_t> moving) {
  const std::vector<Branch> branches = settle(network, moving);
  // The moving pot counts as connected for what hangs on nothing, never as a wire.
  std::vector<Branch> connections = branches;
  if (moving) {
    const PotInNetwork& pot = network.pots[*moving];
    if (pot.top) connections.push_back({BranchKind::resistor, *pot.top, pot.wiper, pot.pot.total_ohm, pot.name});
    connections.push_back({BranchKind::resistor, pot.wiper, pot.bottom, pot.pot.total_ohm, pot.name});
  }
  const MergedNodes merged = merge_wires(network, connections);
  unknowns = merged.unknowns;
  observed = merged[network.grid];
  if (observed == MergedNodes::is_loose)
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
    const int a = merged[branch.a];
    const int b = merged[branch.b];
    if (a == b || a == MergedNodes::is_loose || std::isinf(branch.value)) continue;
    if (branch.kind != BranchKind::inductor) joined_by_rc.emplace_back(a, b);
    if (branch.kind != BranchKind::capacitor) joined_by_rl.emplace_back(a, b);
    if (branch.kind == BranchKind::capacitor) joined_by_c.emplace_back(a, b);
  }
  for (const Branch& branch : branches) {
    const int a = merged[branch.a];
    const int b = merged[branch.b];
    if (a == b || a == MergedNodes::is_loose) continue;
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
  if (moving) {
    const PotInNetwork& pot = network.pots[*moving];
    total_ohm = pot.pot.total_ohm;
    if (pot.top) top_section = incidence(unknowns, merged[*pot.top], merged[pot.wiper]);
    bottom_section = incidence(unknowns, merged[pot.wiper], merged[pot.bottom]);
  }

  // Voltages: across capacitors (from charge), free (from Kirchhoff's current law). Of the free ones, a group held only by
  // inductors takes its level from them, which no current in a resistor depends on.
  const LongMatrix no_capacitor = floating_groups(unknowns, joined_by_c);
  const LongMatrix only_inductors = floating_groups(unknowns, joined_by_rc);
  if (observed >= 0 && only_inductors.cols() > 0 && only_inductors.row(observed).any())
    throw InputError("the network has no solution in time: the grid of the load is held by inductors alone");
  const LongMatrix with_capacitor = complement(no_capacitor);
  free_nodes = no_capacitor * complement(no_capacitor.transpose() * only_inductors);

  const LongMatrix inner = with_capacitor.transpose() * capacitance * with_capacitor;
  const Eigen::LLT<LongMatrix> charge_root(inner);
  const LongMatrix root = charge_root.matrixL();
  // Charges that no resistor or inductor can change stay at zero.
  const LongMatrix sealed = floating_groups(unknowns, joined_by_rl);
  const LongMatrix moving_charges = complement(root.transpose() * with_capacitor.transpose() * sealed);
  charge_to_nodes = with_capacitor * root.transpose().triangularView<Eigen::Upper>().solve(moving_charges);
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
  const LongMatrix flux_to_current =
      currents * flux_lower.transpose().triangularView<Eigen::Upper>().solve(moving_fluxes);
  current_to_nodes = leaving * flux_to_current;
  input_to_flux = flux_to_current.transpose() * inductor_emf;
  fluxes = moving_fluxes.cols();
}

StateSpace StateSpaceFamily::State::solve(Long top_siemens, Long bottom_siemens) const {
  LongMatrix g = conductance;
  LongVector g_emf = conductance_to_emf;
  const auto add = [&](const std::optional<Incidence>& at, Long siemens) {
    if (!at) return;
    g += siemens * at->nodes * at->nodes.transpose();
    g_emf += at->nodes * (at->emf * siemens);
  };
  add(top_section, top_siemens);
  add(bottom_section, bottom_siemens);

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
    nodes_from_states -= free_nodes * kirchhoff.solve(free_nodes.transpose() * current);
    nodes_from_input -= free_nodes * kirchhoff.solve(free_nodes.transpose() * input_current);
  }
  StateSpace result;
  result.a.resize(states, states);
  result.b.resize(states);
  result.a.topRows(charges) = -charge_to_nodes.transpose() * (g * nodes_from_states + inductor_currents);
  result.b.head(charges) = -charge_to_nodes.transpose() * (g * nodes_from_input + g_emf);
  result.a.bottomRows(fluxes) = current_to_nodes.transpose() * nodes_from_states;
  result.b.tail(fluxes) = current_to_nodes.transpose() * nodes_from_input + input_to_flux;
  if (observed >= 0) {
    result.c = nodes_from_states.row(observed);
    result.d = nodes_from_input(observed);
  } else {
    result.c = LongRow::Zero(states);
    result.d = observed == MergedNodes::is_emf ? 1 : 0;
  }
  if (!result.a.allFinite() || !result.b.allFinite() || !result.c.allFinite())
    throw InputError("the network has no solution: it is singular at this position of the knob");
  return result;
}

StateSpaceFamily::StateSpaceFamily(const Network& network, std::optional<std::size_t> moving)
    : state_(std::make_unique<State>(network, moving)) {}
StateSpaceFamily::~StateSpaceFamily() = default;
StateSpaceFamily::StateSpaceFamily(StateSpaceFamily&&) noexcept = default;
StateSpaceFamily& StateSpaceFamily::operator=(StateSpaceFamily&&) noexcept = default;

int StateSpaceFamily::states() const noexcept { return static_cast<int>(state_->charges + state_->fluxes); }

StateSpace StateSpaceFamily::at(double fraction) const {
  const Long total = state_->total_ohm;
  const Long floor = section_floor_ohm;
  const Long bottom = std::max(fraction * total, floor);
  const Long top = std::max((1 - static_cast<Long>(fraction)) * total, floor);
  return state_->solve(1 / top, 1 / bottom);
}

StateSpace StateSpaceFamily::disconnected() const { return state_->solve(0, 0); }

std::vector<double> natural_frequencies_hz(const Network& network) {
  const StateSpace space = StateSpaceFamily(network).at(0);
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
