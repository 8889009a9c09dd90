#include "dsp/hookup.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <map>
#include <string_view>

#include "dsp/quantity.h"

namespace unsoldered {
namespace {

constexpr std::array<std::string_view, 7> kDrawnNodes = {"emf", "source", "top", "wiper", "bottom", "output", "grid"};

bool is_drawn(const Hookup& hookup, std::string_view node) {
  return node == "ground" || (node == "coil" && hookup.source.kind == SourceKind::pickup) ||
         std::find(kDrawnNodes.begin(), kDrawnNodes.end(), node) != kDrawnNodes.end();
}

void require(bool holds, const std::string& key, const std::string& what) {
  if (!holds) {
    throw HookupError(key, what);
  }
}

std::string deg(double value) {
  const std::string text = format_quantity(value, Unit::metre);  // plain decimal digits
  return text.substr(0, text.size() - 2) + " degrees";
}

void validate_pot(const Pot& pot, const std::string& block) {
  require(std::isfinite(pot.total_ohm) && pot.total_ohm > 0, block + ".resistance",
          format_quantity(pot.total_ohm, Unit::ohm) + " is no resistance a pot can have; it must be above zero");
  require(pot.end_ohm >= 0 && 2 * pot.end_ohm < pot.total_ohm, block + ".end_resistance",
          format_quantity(pot.end_ohm, Unit::ohm) + " at each end leaves nothing of the total " +
              format_quantity(pot.total_ohm, Unit::ohm) + "; accepted is below half of it");
  require(std::isfinite(pot.travel_deg) && pot.travel_deg > 0, block + ".travel",
          deg(pot.travel_deg) + " is no travel; it must be above zero");
  require(pot.dead_ccw_deg >= 0 && pot.dead_cw_deg >= 0 && pot.dead_ccw_deg + pot.dead_cw_deg < pot.travel_deg,
          block + ".dead_travel",
          deg(pot.dead_ccw_deg) + " and " + deg(pot.dead_cw_deg) + " leave nothing of the travel of " +
              deg(pot.travel_deg) + "; together they must be less");
}

void validate_dial(double dial, const std::string& key) {
  require(dial >= 0 && dial <= 10, key, "the dial goes from 0 to 10");
}

std::string list_of_wires(const Hookup& hookup) {
  std::string out;
  for (const Wire& wire : replaceable_wires(hookup)) {
    out += (out.empty() ? "\"" : ", \"") + wire.name() + "\"";
  }
  return out;
}

void validate_node_name(const std::string& node, const std::string& key) {
  const bool spelled = !node.empty() && std::all_of(node.begin(), node.end(), [](char c) {
    return (c >= 'a' && c <= 'z') || (c >= '0' && c <= '9') || c == '_' || c == '-';
  });
  require(spelled, key,
          "\"" + node +
              "\" is not a node name; accepted are lower-case letters, digits, '-' and '_', as in \"wiper\" or \"x1\"");
  constexpr std::string_view kept = "_inside";  // nodes inside the blocks are called that
  require(node.size() < kept.size() || node.compare(node.size() - kept.size(), kept.size(), kept) != 0, key,
          "node names that end in _inside are taken; choose another");
}

void validate_extra(const Hookup& hookup, const ExtraPart& part, const std::string& block) {
  if (!part.in_place_of.empty()) {
    require(find_wire(hookup, part.in_place_of).has_value(), block + ".in_place_of",
            "this hookup has no wire \"" + part.in_place_of + "\"; accepted are " + list_of_wires(hookup));
  }
  const std::size_t wanted = part.kind == PartKind::pot ? 3 : 2;
  require(part.between.size() == wanted, block + ".between",
          std::to_string(part.between.size()) + " nodes are given; " +
              (wanted == 3 ? "a pot has three, in the order top, wiper, bottom" : "this part has two"));
  for (const std::string& node : part.between) {
    validate_node_name(node, block + ".between");
  }
  const std::string& first = part.between.front();
  require(std::any_of(part.between.begin(), part.between.end(), [&](const std::string& n) { return n != first; }),
          block + ".between", "all ends are at \"" + first + "\", so the part does nothing; name different nodes");
  if (part.kind == PartKind::pot) {
    validate_pot(part.pot, block);
    validate_dial(part.dial, block + ".dial");
  } else {
    require(std::isfinite(part.value) && (part.value > 0 || (part.value == 0 && part.kind == PartKind::resistor)),
            block + ".value", "the value must be above zero");
  }
}

/// True when one character more, less or other makes `a` into `b`, or two neighbours swapped.
bool one_slip_apart(std::string_view a, std::string_view b) {
  if (a.size() > b.size()) {
    std::swap(a, b);
  }
  if (b.size() - a.size() > 1 || a == b) {
    return false;
  }
  const auto differ = std::mismatch(a.begin(), a.end(), b.begin());
  const std::string_view rest_a(differ.first, a.end());
  const std::string_view rest_b(differ.second, b.end());
  if (a.size() < b.size()) {
    return rest_a == rest_b.substr(1);
  }
  return rest_a.substr(1) == rest_b.substr(1) || (rest_a.size() > 1 && rest_a[0] == rest_b[1] &&
                                                  rest_a[1] == rest_b[0] && rest_a.substr(2) == rest_b.substr(2));
}

/// A new node that only one part reaches and that is spelled nearly like a drawn one is a slip of the pen.
void refuse_misspelled_nodes(const Hookup& hookup) {
  std::map<std::string, int> uses;
  for (const ExtraPart& part : hookup.extra) {
    for (const std::string& node : part.between) {
      ++uses[node];
    }
  }
  for (std::size_t i = 0; i < hookup.extra.size(); ++i) {
    for (const std::string& node : hookup.extra[i].between) {
      if (uses[node] > 1 || is_drawn(hookup, node)) {
        continue;
      }
      for (std::string_view drawn : {"emf", "coil", "source", "top", "wiper", "bottom", "output", "grid", "ground"}) {
        require(!(is_drawn(hookup, drawn) && one_slip_apart(node, drawn)), "extra." + std::to_string(i) + ".between",
                "nothing else is at node \"" + node + "\"; was \"" + std::string(drawn) + "\" meant?");
      }
    }
  }
}

void validate_band(const Band& band, const std::string& key) {
  require(band.from_hz > 0 && band.to_hz > band.from_hz && std::isfinite(band.to_hz), key,
          "a band goes from a lower to a higher frequency above zero, as in [2000, 5000]");
}

}  // namespace

void validate(const Hookup& hookup) {
  validate_pot(hookup.volume.pot, "volume");
  if (hookup.tone) {
    validate_pot(hookup.tone->pot, "tone");
    validate_dial(hookup.tone->dial, "tone.dial");
  }
  if (hookup.treble_bleed) {
    require(!(hookup.treble_bleed->parallel_ohm && hookup.treble_bleed->series_ohm), "treble_bleed.series_resistor",
            "parallel_resistor is given as well; a treble bleed here has at most one resistor (a second one goes into "
            "[[extra]])");
  }
  if (hookup.source.kind == SourceKind::piezo) {
    require(hookup.source.capacitance_f.value_or(0) > 0, "source.capacitance",
            "a piezo needs a capacitance above zero");
  }
  for (std::size_t i = 0; i < hookup.extra.size(); ++i) {
    validate_extra(hookup, hookup.extra[i], "extra." + std::to_string(i));
  }
  refuse_misspelled_nodes(hookup);
  if (hookup.listening) {
    validate_band(hookup.listening->treble, "listening.treble_band");
    validate_band(hookup.listening->body, "listening.body_band");
  }
}

std::vector<Wire> replaceable_wires(const Hookup& hookup) {
  std::vector<Wire> wires;
  if (hookup.volume.source_on == SourceOn::top) {
    wires = {{"source", "top"}, {"wiper", "output"}};
  } else {
    wires = {{"source", "wiper"}, {"top", "output"}};
  }
  wires.push_back({"bottom", "ground"});
  if (!hookup.load.coupling_f) {
    wires.push_back({"output", "grid"});
  }
  return wires;
}

std::optional<Wire> find_wire(const Hookup& hookup, const std::string& name) {
  for (const Wire& wire : replaceable_wires(hookup)) {
    if (name == wire.name() || name == wire.to + "-" + wire.from) {
      return wire;
    }
  }
  return std::nullopt;
}

Listening listening_bands(const Hookup& hookup) noexcept {
  if (hookup.listening) {
    return *hookup.listening;
  }
  const Band body{200, 800};
  return hookup.source.kind == SourceKind::line ? Listening{{5000, 15000}, body} : Listening{{2000, 5000}, body};
}

Knob parse_knob(const Hookup& hookup, const std::string& name) {
  if (name == "volume") {
    return Knob::volume;
  }
  if (name == "tone" && hookup.tone) {
    return Knob::tone;
  }
  throw InputError("knob \"" + name + "\": this hookup has " +
                   (hookup.tone ? "the knobs volume and tone" : "one knob, volume") +
                   (name == "tone" ? "; add a [tone] block to have a tone knob" : ""));
}

}  // namespace unsoldered
