#include "dsp/network.h"

#include <algorithm>
#include <cmath>

#include "dsp/disjoint_sets.h"
#include "dsp/error.h"

namespace unsoldered {

Node Network::node(const std::string& name) {
  if (node_names.empty()) node_names.emplace_back("ground");
  const auto found = std::find(node_names.begin(), node_names.end(), name);
  if (found != node_names.end()) return static_cast<Node>(found - node_names.begin());
  node_names.push_back(name);
  return static_cast<Node>(node_names.size()) - 1;
}

PotSections pot_sections(const Pot& pot, double fraction, double floor_ohm) noexcept {
  return {std::max((1 - fraction) * pot.total_ohm, floor_ohm), std::max(fraction * pot.total_ohm, floor_ohm)};
}

bool is_open(const PotInNetwork& pot, double dial) noexcept { return pot.open_at_ten && dial >= 10; }

double fraction_below(const PotInNetwork& pot, double dial) noexcept {
  if (!pot.backwards) return element_fraction(pot.pot, dial);
  Pot mirrored = pot.pot;
  std::swap(mirrored.dead_ccw_deg, mirrored.dead_cw_deg);
  return element_fraction(mirrored, 10 - dial);
}

std::vector<Branch> settle(const Network& network, const std::vector<std::size_t>& keep) {
  std::vector<Branch> branches = network.branches;
  for (std::size_t i = 0; i < network.pots.size(); ++i) {
    if (std::find(keep.begin(), keep.end(), i) != keep.end()) continue;
    const PotInNetwork& pot = network.pots[i];
    const PotSections sections = pot_sections(pot.pot, fraction_below(pot, pot.dial));
    if (pot.top)
      branches.push_back(
          {BranchKind::resistor, *pot.top, pot.wiper, sections.top_ohm, pot.name + ", top to wiper", pot.after_output});
    if (!is_open(pot, pot.dial))
      branches.push_back({BranchKind::resistor, pot.wiper, pot.bottom, sections.bottom_ohm,
                          pot.name + ", wiper to bottom", pot.after_output});
  }
  return branches;
}

MergedNodes merge_wires(const Network& network, const std::vector<Branch>& branches) {
  const std::size_t count = network.node_names.size();
  DisjointSets wired(count);
  DisjointSets reached(count);
  reached.join(network.emf, network.emf_return);
  for (const Branch& branch : branches) {
    if (branch.kind == BranchKind::resistor && std::isinf(branch.value)) continue;
    if (branch.kind == BranchKind::resistor && branch.value == 0) wired.join(branch.a, branch.b);
    reached.join(branch.a, branch.b);
  }
  if (wired.together(network.emf, network.emf_return)) {
    std::string where;
    for (const PotInNetwork& pot : network.pots) {
      const double fraction = fraction_below(pot, pot.dial);
      if (fraction > 0 && fraction < 1) continue;
      where += (where.empty() ? " with " : ", ") + pot.name + " at an end";
    }
    throw InputError("the ideal generator is short-circuited" + where +
                     ": nothing limits its current, so the network has no solution; give the source (or the "
                     "buffer's output) a resistance or the pot an end_resistance");
  }
  // The generator's node is numbered as its return, unless it is the one at ground.
  const bool emf_at_ground = wired.together(network.emf, Network::ground);
  const Node hub = emf_at_ground ? network.emf : network.emf_return;
  const Node other = emf_at_ground ? network.emf_return : network.emf;
  const double ride = emf_at_ground ? -1 : 1;
  MergedNodes merged;
  merged.places.resize(count);
  std::vector<int> number(count, -1);
  for (std::size_t i = 0; i < count; ++i) {
    const Node node = static_cast<Node>(i);
    if (!reached.together(node, Network::ground)) continue;
    const bool rides = wired.together(node, other);
    const auto root = static_cast<std::size_t>(wired.find(rides ? hub : node));
    MergedNodes::Place& place = merged.places[i];
    place.emf = rides ? ride : 0;
    if (wired.together(rides ? hub : node, Network::ground)) {
      place.index = MergedNodes::is_ground;
    } else {
      if (number[root] < 0) number[root] = merged.unknowns++;
      place.index = number[root];
    }
  }
  return merged;
}

void require_no_loose_parts(const Network& network) {
  DisjointSets reached(network.node_names.size());
  reached.join(network.emf, network.emf_return);
  for (const Branch& branch : network.branches)
    if (!std::isinf(branch.value)) reached.join(branch.a, branch.b);
  for (const PotInNetwork& pot : network.pots) {
    if (pot.top) reached.join(*pot.top, pot.wiper);
    reached.join(pot.wiper, pot.bottom);
  }
  const auto check = [&](Node node, const std::string& part) {
    if (reached.together(node, Network::ground)) return;
    throw InputError("the network has no solution: node \"" + network.node_names[static_cast<std::size_t>(node)] +
                     "\" (" + part +
                     ") has no path to ground or to the source; connect it to one of the nodes of the drawing");
  };
  for (const Branch& branch : network.branches) check(branch.a, branch.name);
  for (const PotInNetwork& pot : network.pots) check(pot.wiper, pot.name);
}

std::vector<PotPlace> pots_of(const Circuit& circuit, const Knob& knob) {
  std::vector<PotPlace> places;
  for (std::size_t stage = 0; stage < circuit.stages.size(); ++stage) {
    const std::vector<PotInNetwork>& pots = circuit.stages[stage].pots;
    for (std::size_t pot = 0; pot < pots.size(); ++pot)
      if (pots[pot].knob == knob) places.push_back({stage, pot});
  }
  return places;
}

}  // namespace unsoldered
