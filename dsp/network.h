// A linear network of resistors, capacitors, inductors and pots between named nodes, driven by one emf.
//
// Plain data; it knows nothing of hookups. hookup_network.h makes one from a hookup, settle() gives it knob positions,
// nodal.h solves it at a frequency, state_space.h brings it to a form that can be stepped in time.
#pragma once

#include <limits>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "dsp/hookup.h"

namespace unsoldered {

using Node = int;

enum class BranchKind { resistor, capacitor, inductor };

/// One two-terminal part. `value` in ohm, farad or henry. A resistor of 0 ohm is a wire, one of infinite ohm is left out.
struct Branch {
  BranchKind kind = BranchKind::resistor;
  Node a = 0;
  Node b = 0;
  double value = 0;
  std::string name;           // what the user would call it: "cable", "load resistance"
  bool after_output = false;  // cable and load: left out of the output resistance
};

/// A pot or, with no top, a rheostat (only the section below the wiper is connected).
struct PotInNetwork {
  Pot pot;
  std::optional<Node> top;
  Node wiper = 0;
  Node bottom = 0;
  double dial = 10;
  bool open_at_ten = false;  // no-load: the section below the wiper is open with the dial at 10
  std::optional<Knob> knob;  // the knob of the hookup that turns it
  std::string name;
};

struct Network {
  static constexpr Node ground = 0;

  std::vector<std::string> node_names;  // index: Node
  std::vector<Branch> branches;
  std::vector<PotInNetwork> pots;
  Node emf = 0;
  Node output = 0;
  Node grid = 0;

  /// The node of that name, made if there is none yet.
  Node node(const std::string& name);
};

/// Sections of a pot at an element fraction RB/RT, each at least `floor_ohm`.
struct PotSections {
  double top_ohm = 0;
  double bottom_ohm = 0;
};
PotSections pot_sections(const Pot& pot, double fraction, double floor_ohm = 0) noexcept;

/// The section below the wiper is disconnected here.
bool is_open(const PotInNetwork& pot, double dial) noexcept;

/// Turns the pots that `knob` moves. dial 0..10.
void set_dial(Network& network, Knob knob, double dial);

/// Every pot replaced by resistors at its dial; pots listed in `keep` (by index) are left out.
std::vector<Branch> settle(const Network& network, std::optional<std::size_t> keep = std::nullopt);

/// Nodes after wires are merged and what hangs on nothing is dropped.
struct MergedNodes {
  static constexpr int is_ground = -1;
  static constexpr int is_emf = -2;
  static constexpr int is_loose = -3;  // no path to ground or emf
  std::vector<int> index;              // by Node: 0..unknowns-1, or one of the above
  int unknowns = 0;

  int operator[](Node node) const { return index[static_cast<std::size_t>(node)]; }
};

/// Merges along resistors of 0 ohm. Throws InputError when that shorts the emf to ground.
MergedNodes merge_wires(const Network& network, const std::vector<Branch>& branches);

/// Refuses networks with parts that hang on nothing: throws InputError naming the node.
void require_no_loose_parts(const Network& network);

}  // namespace unsoldered
