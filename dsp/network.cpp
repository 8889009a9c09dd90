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

void set_dial(Network& network, Knob knob, double dial) {
  for (PotInNetwork& pot : network.pots)
    if (pot.knob == knob) pot.dial = dial;
}

std::vector<Branch> settle(const Network& network, std::optional<std::size_t> keep) {
  std::vector<Branch> branches = network.branches;
  for (std::size_t i = 0; i < network.pots.size(); ++i) {
    if (keep == i) continue;
    const PotInNetwork& pot = network.pots[i];
    const PotSections sections = pot_sections(pot.pot, element_fraction(pot.pot, pot.dial));
    if (pot.top)
      branches.push_back({BranchKind::resistor, *pot.top, pot.wiper, sections.top_ohm, pot.name + ", top to wiper"});
    if (!is_open(pot, pot.dial))
      branches.push_back(
          {BranchKind::resistor, pot.wiper, pot.bottom, sections.bottom_ohm, pot.name + ", wiper to bottom"});
  }
  return branches;
}

MergedNodes merge_wires(const Network& network, const std::vector<Branch>& branches) {
  const std::size_t count = network.node_names.size();
  DisjointSets wired(count);
  DisjointSets reached(count);
  reached.join(network.emf, Network::ground);
  for (const Branch& branch : branches) {
    if (branch.kind == BranchKind::resistor && std::isinf(branch.value)) continue;
    if (branch.kind == BranchKind::resistor && branch.value == 0) wired.join(branch.a, branch.b);
    reached.join(branch.a, branch.b);
  }
  if (wired.together(network.emf, Network::ground)) {
    std::string where;
    for (const PotInNetwork& pot : network.pots)
      where += (where.empty() ? " with " : ", ") + pot.name + " at dial " + std::to_string(pot.dial).substr(0, 5);
    throw InputError("the ideal generator is short-circuited" + where +
                     ": nothing limits its current, so the network has no solution; give the source a resistance or "
                     "the pot an end_resistance");
  }
  MergedNodes merged;
  merged.index.assign(count, MergedNodes::is_loose);
  std::vector<int> number(count, -1);
  for (std::size_t i = 0; i < count; ++i) {
    const Node node = static_cast<Node>(i);
    if (!reached.together(node, Network::ground)) continue;
    const auto root = static_cast<std::size_t>(wired.find(node));
    if (wired.together(node, Network::ground)) {
      merged.index[i] = MergedNodes::is_ground;
    } else if (wired.together(node, network.emf)) {
      merged.index[i] = MergedNodes::is_emf;
    } else {
      if (number[root] < 0) number[root] = merged.unknowns++;
      merged.index[i] = number[root];
    }
  }
  return merged;
}

void require_no_loose_parts(const Network& network) {
  DisjointSets reached(network.node_names.size());
  reached.join(network.emf, Network::ground);
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

}  // namespace unsoldered
