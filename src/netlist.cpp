#include "src/netlist.h"

#include <array>
#include <charconv>

#include "dsp/disjoint_sets.h"
#include "dsp/hookup_network.h"

namespace unsoldered {
namespace {

/// Shortest text that reads back as the same number; ngspice takes exponents.
std::string exact_number(double value) {
  std::array<char, 32> text{};
  return {text.data(), std::to_chars(text.data(), text.data() + text.size(), value).ptr};
}

std::string node_text(const Network& network, Node node) {
  return node == Network::ground ? "0" : network.node_names[static_cast<std::size_t>(node)];
}

std::string printable(const std::string& title) {
  std::string result;
  for (const char letter : title) result += static_cast<unsigned char>(letter) < ' ' ? ' ' : letter;
  return result;
}

}  // namespace

std::string netlist_text(const Hookup& hookup, double dial) {
  const Circuit circuit = hookup_circuit(hookup, dial);
  const Network& first = circuit.stages.front();
  std::string deck = "* " + printable(hookup.title) + ", volume at " + exact_number(dial) + "\n";
  // The reversed source of a hookup out of phase is turned round here.
  const bool reversed = circuit.gains.back() < 0;
  deck += "Vemf " + node_text(first, first.emf) + " " + node_text(first, first.emf_return) + " AC 1" +
          (reversed ? " 180" : "") + "\n";
  int number = 0;
  for (std::size_t stage = 0; stage < circuit.stages.size(); ++stage) {
    const Network& network = circuit.stages[stage];
    if (stage > 0) {
      const Network& before = circuit.stages[stage - 1];
      deck += "E" + std::to_string(stage) + " " + node_text(network, network.emf) + " 0 " +
              node_text(before, before.grid) + " 0 " + exact_number(circuit.gains[stage - 1]) + " $ buffer\n";
    }
    DisjointSets wired(network.node_names.size());
    for (const Branch& branch : settle(network)) {
      ++number;
      const bool wire = branch.kind == BranchKind::resistor && branch.value == 0;
      if (wire && wired.together(branch.a, branch.b)) continue;  // a loop of wires would have no one current
      if (wire) wired.join(branch.a, branch.b);
      const char letter = wire                                   ? 'V'
                          : branch.kind == BranchKind::resistor  ? 'R'
                          : branch.kind == BranchKind::capacitor ? 'C'
                                                                 : 'L';
      deck += letter + std::to_string(number) + " " + node_text(network, branch.a) + " " +
              node_text(network, branch.b) + " " + exact_number(branch.value) + " $ " + branch.name + "\n";
    }
  }
  deck +=
      ".ac dec 20 20 20k\n"
      ".print ac vdb(grid) vp(grid)\n"
      ".end\n";
  return deck;
}

}  // namespace unsoldered
