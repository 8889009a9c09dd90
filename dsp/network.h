// A linear network of resistors, capacitors, inductors and pots between named nodes, driven by one emf.
//
// Plain data; it knows nothing of hookups. hookup_network.h makes them from a hookup, settle() gives them knob positions,
// nodal.h solves them at a frequency, state_space.h brings them to a form that can be stepped in time.
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
  bool after_output = false;  // cable, further stages and load: left out of the output resistance
};

/// A pot or, with no top, a rheostat (only the section below the wiper is connected).
struct PotInNetwork {
  Pot pot;
  std::optional<Node> top;
  Node wiper = 0;
  Node bottom = 0;
  double dial = 10;
  bool open_at_ten = false;  // no-load: the section below the wiper is open with the dial at 10
  bool backwards = false;    // its share of the track below the wiper falls as the dial goes up
  std::optional<Knob> knob;  // the knob of the hookup that turns it
  std::string name;
  bool after_output = false;
};

/// RB/RT at its own dial, or at another one.
double fraction_below(const PotInNetwork& pot, double dial) noexcept;

struct Network {
  static constexpr Node ground = 0;

  std::vector<std::string> node_names;  // index: Node
  std::vector<Branch> branches;
  std::vector<PotInNetwork> pots;
  Node emf = 0;
  Node emf_return = ground;  // the generator lies between the two
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

/// Every pot replaced by resistors at its dial; pots listed in `keep` (by index) are left out.
std::vector<Branch> settle(const Network& network, const std::vector<std::size_t>& keep = {});

/// Nodes after wires are merged and what hangs on nothing is dropped. The generator joins its two nodes: one of them stands
/// for both, and the other's voltage is that plus the emf.
struct MergedNodes {
  static constexpr int is_ground = -1;
  static constexpr int is_loose = -3;  // no path to ground
  struct Place {
    int index = is_loose;  // 0..unknowns-1, or one of the above
    double emf = 0;        // 1: plus the emf
    bool operator==(const Place&) const = default;
  };
  std::vector<Place> places;  // by Node
  int unknowns = 0;

  const Place& operator[](Node node) const { return places[static_cast<std::size_t>(node)]; }
};

/// Merges along resistors of 0 ohm. Throws InputError when that short-circuits the generator.
MergedNodes merge_wires(const Network& network, const std::vector<Branch>& branches);

/// Refuses networks with parts that hang on nothing: throws InputError naming the node.
void require_no_loose_parts(const Network& network);

/// A chain of networks, each driving the next through an amplifier of fixed gain: what a hookup with buffers is.
struct Circuit {
  std::vector<Network> stages;  // the grid of one is amplified to the emf of the next
  std::vector<double>
      gains;  // gains[i]: of what follows the grid of stages[i]; the last is 1, or -1 for a reversed source
};

struct PotPlace {
  std::size_t stage = 0;
  std::size_t pot = 0;
  bool operator==(const PotPlace&) const = default;
};

/// The pots that a knob moves: one, two for a blend of two gangs, none when the circuit has no such knob.
std::vector<PotPlace> pots_of(const Circuit& circuit, const Knob& knob);

}  // namespace unsoldered
