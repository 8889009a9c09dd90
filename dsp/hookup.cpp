#include "dsp/hookup.h"

#include <algorithm>
#include <cmath>
#include <iterator>
#include <map>
#include <string_view>

#include "dsp/quantity.h"

namespace unsoldered {
namespace {

/// Nodes of the drawing: those that wires or parts of the blocks end at.
std::vector<std::string> drawn_nodes(const Hookup& hookup) {
  std::vector<std::string> nodes = {"ground", "emf", "source", "top", "wiper", "bottom", "output", "grid"};
  if (hookup.source.kind == SourceKind::pickup) nodes.emplace_back("coil");
  if (hookup.second) {
    if (hookup.second->source.kind == SourceKind::pickup) nodes.emplace_back("second_coil");
    nodes.insert(nodes.end(), {"emf2", "first_output", "second_source", "second_output", "second_ground"});
    if (hookup.second->volume) nodes.insert(nodes.end(), {"second_top", "second_wiper", "second_bottom"});
  }
  for (std::size_t i = 0; i < hookup.then.size(); ++i) {
    const std::string name = "then" + std::to_string(i + 1) + "_";
    nodes.push_back(name + "output");
    if (hookup.then[i].volume)
      for (const char* lug : {"top", "wiper", "bottom"}) nodes.push_back(name + lug);
  }
  return nodes;
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
  const std::vector<std::string> drawn = drawn_nodes(hookup);
  for (std::size_t i = 0; i < hookup.extra.size(); ++i) {
    for (const std::string& node : hookup.extra[i].between) {
      if (uses[node] > 1 || std::find(drawn.begin(), drawn.end(), node) != drawn.end()) {
        continue;
      }
      for (const std::string& known : drawn) {
        require(!one_slip_apart(node, known), "extra." + std::to_string(i) + ".between",
                "nothing else is at node \"" + node + "\"; was \"" + known + "\" meant?");
      }
    }
  }
}

void validate_band(const Band& band, const std::string& key) {
  require(band.from_hz > 0 && band.to_hz > band.from_hz && std::isfinite(band.to_hz), key,
          "a band goes from a lower to a higher frequency above zero, as in [2000, 5000]");
}

void validate_gangs(const Pot& pot, const std::optional<Pot>& right, const std::string& block) {
  validate_pot(pot, block);
  if (right) validate_pot(*right, block + ".right");
}

/// Controls as the first source, the second and every further stage may have them.
void validate_controls(const std::optional<Volume>& volume, const std::optional<TrebleBleed>& bleed,
                       const std::optional<Tone>& tone, const std::string& block) {
  if (volume) {
    validate_gangs(volume->pot, volume->right, block + "volume");
    validate_dial(volume->dial, block + "volume.dial");
  }
  if (tone) {
    validate_gangs(tone->pot, tone->right, block + "tone");
    validate_dial(tone->dial, block + "tone.dial");
  }
  if (bleed) {
    require(volume.has_value(), block + "treble_bleed",
            "a treble bleed lies from top to wiper of a volume pot; add a volume beside it or take it out");
    require(!(bleed->parallel_ohm && bleed->series_ohm), block + "treble_bleed.series_resistor",
            "parallel_resistor is given as well; a treble bleed here has at most one resistor (a second one goes into "
            "[[extra]])");
  }
}

void validate_source(const Source& source, const std::string& block) {
  if (source.kind == SourceKind::piezo)
    require(source.capacitance_f.value_or(0) > 0, block + ".capacitance", "a piezo needs a capacitance above zero");
}

void validate_joining(const Hookup& hookup) {
  const Selector& selector = hookup.selector;
  if (!hookup.second) {
    require(selector.use == SelectorUse::both && selector.joined == Joined::parallel && !selector.out_of_phase,
            "selector", "there is nothing to select; add [second.source] or take the selector out");
    require(!hookup.blend, "blend", "there is nothing to blend with; add [second.source] or take the blend out");
    require(!hookup.second_channel, "second_channel",
            "there is no second source for it; add [second.source] or take it out");
    return;
  }
  if (hookup.blend) {
    validate_pot(hookup.blend->pot, "blend");
    validate_dial(hookup.blend->dial, "blend.dial");
    require(selector.use == SelectorUse::both, "selector.use",
            "a [blend] joins both sources, so the selector cannot use one alone; take one of the two out (a blend at "
            "dial 0 "
            "or 10 has one source alone)");
    require(selector.joined == Joined::parallel, "selector.joined",
            "a [blend] joins the sources in parallel; take the blend out for \"series\"");
  }
  require(!(selector.joined == Joined::series && selector.use != SelectorUse::both), "selector.joined",
          "\"series\" needs both sources; write use = \"both\" or take it out");
}

void validate_stage(const Stage& stage, const std::string& block) {
  validate_controls(stage.volume, stage.treble_bleed, stage.tone, block + ".");
  require(!(stage.buffer && (stage.volume || stage.treble_bleed || stage.tone)), block + ".buffer",
          "a stage is either a buffer or has controls; write two [[then]] in the order of the signal");
  require(stage.buffer || stage.volume || stage.tone || stage.cable, block,
          "the stage holds nothing; give it a volume, a tone, a cable or a buffer");
}

std::vector<Wire> pot_wires(const std::string& prefix, SourceOn source_on, const std::string& from,
                            const std::string& to, const std::string& ground) {
  const bool on_top = source_on == SourceOn::top;
  return {{from, prefix + (on_top ? "top" : "wiper")},
          {prefix + (on_top ? "wiper" : "top"), to},
          {prefix + "bottom", ground}};
}

void append(std::vector<Wire>& wires, std::vector<Wire> more) {
  wires.insert(wires.end(), std::make_move_iterator(more.begin()), std::make_move_iterator(more.end()));
}

}  // namespace

void validate(const Hookup& hookup) {
  validate_source(hookup.source, "source");
  validate_controls(hookup.volume, hookup.treble_bleed, hookup.tone, "");
  if (hookup.second) {
    validate_source(hookup.second->source, "second.source");
    validate_controls(hookup.second->volume, hookup.second->treble_bleed, hookup.second->tone, "second.");
  }
  validate_joining(hookup);
  for (std::size_t i = 0; i < hookup.then.size(); ++i) validate_stage(hookup.then[i], "then." + std::to_string(i));
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
  const bool two = hookup.second.has_value();
  std::vector<Wire> wires = pot_wires("", hookup.volume.source_on, "source", two ? "first_output" : "output", "ground");
  if (two) {
    const std::optional<Volume>& volume = hookup.second->volume;
    if (volume)
      append(wires, pot_wires("second_", volume->source_on, "second_source", "second_output", "second_ground"));
    else
      wires.push_back({"second_source", "second_output"});
    const bool in_series = hookup.selector.joined == Joined::series;
    wires.push_back({"second_ground", in_series ? "first_output" : "ground"});
    if (!hookup.blend) {
      if (!in_series && hookup.selector.use != SelectorUse::second) wires.push_back({"first_output", "output"});
      if (hookup.selector.use != SelectorUse::first) wires.push_back({"second_output", "output"});
    }
  }
  std::string last = "output";
  for (std::size_t i = 0; i < hookup.then.size(); ++i) {
    const Stage& stage = hookup.then[i];
    const std::string prefix = "then" + std::to_string(i + 1) + "_";
    if (stage.volume)
      append(wires, pot_wires(prefix, stage.volume->source_on, last, prefix + "output", "ground"));
    else if (!stage.buffer)
      wires.push_back({last, prefix + "output"});
    last = prefix + "output";
  }
  if (!hookup.load.coupling_f) wires.push_back({last, "grid"});
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
  const SourceKind kind = driven_source(hookup) == Driven::second ? hookup.second->source.kind : hookup.source.kind;
  return kind == SourceKind::line ? Listening{{5000, 15000}, body} : Listening{{2000, 5000}, body};
}

Driven driven_source(const Hookup& hookup) noexcept {
  return hookup.second && hookup.selector.use == SelectorUse::second && !hookup.second_channel ? Driven::second
                                                                                               : Driven::first;
}

namespace {

/// Calls visit(volume or tone) for every control that a hookup has.
template <typename AnyHookup, typename Visit>
void for_each_control(AnyHookup& hookup, const Visit& visit) {
  visit(hookup.volume);
  if (hookup.tone) visit(*hookup.tone);
  if (hookup.second) {
    if (hookup.second->volume) visit(*hookup.second->volume);
    if (hookup.second->tone) visit(*hookup.second->tone);
  }
  for (auto& stage : hookup.then) {
    if (stage.volume) visit(*stage.volume);
    if (stage.tone) visit(*stage.tone);
  }
}

}  // namespace

bool has_right_gang(const Hookup& hookup) noexcept {
  bool found = false;
  for_each_control(hookup, [&](const auto& control) { found = found || control.right.has_value(); });
  return found;
}

Hookup right_half(const Hookup& hookup) {
  Hookup half = hookup;
  for_each_control(half, [](auto& control) {
    if (control.right) control.pot = *control.right;
    control.right.reset();
  });
  return half;
}

std::vector<NamedKnob> knobs_of(const Hookup& hookup) {
  std::vector<NamedKnob> knobs = {{"volume", Knob::volume}};
  if (hookup.tone) knobs.push_back({"tone", Knob::tone});
  if (hookup.second && hookup.second->volume) knobs.push_back({"second.volume", {KnobKind::second_volume}});
  if (hookup.second && hookup.second->tone) knobs.push_back({"second.tone", {KnobKind::second_tone}});
  if (hookup.blend) knobs.push_back({"blend", {KnobKind::blend}});
  for (std::size_t i = 0; i < hookup.then.size(); ++i) {
    const int number = static_cast<int>(i);
    const std::string block = "then." + std::to_string(i);
    if (hookup.then[i].volume) knobs.push_back({block + ".volume", {KnobKind::stage_volume, number}});
    if (hookup.then[i].tone) knobs.push_back({block + ".tone", {KnobKind::stage_tone, number}});
  }
  for (std::size_t i = 0; i < hookup.extra.size(); ++i)
    if (hookup.extra[i].kind == PartKind::pot)
      knobs.push_back({"extra." + std::to_string(i), {KnobKind::extra, static_cast<int>(i)}});
  return knobs;
}

Knob parse_knob(const Hookup& hookup, const std::string& name) {
  const std::vector<NamedKnob> knobs = knobs_of(hookup);
  for (const NamedKnob& known : knobs) {
    if (known.name == name || (name == "pedal" && known.knob.kind == KnobKind::stage_volume)) return known.knob;
  }
  std::string list;
  bool pedal = false;
  for (const NamedKnob& known : knobs) {
    list += (list.empty() ? "" : ", ") + known.name;
    if (known.knob.kind == KnobKind::stage_volume && !pedal) list += " (or pedal)";
    pedal = pedal || known.knob.kind == KnobKind::stage_volume;
  }
  throw InputError("knob \"" + name + "\": this hookup has " + (knobs.size() == 1 ? "one knob, " : "the knobs ") +
                   list +
                   (name == "tone"    ? "; add a [tone] block to have a tone knob"
                    : name == "pedal" ? "; a pedal is a volume in a [[then]] stage"
                                      : ""));
}

void set_dial(Hookup& hookup, const Knob& knob, double dial) {
  const auto number = static_cast<std::size_t>(knob.number);
  switch (knob.kind) {
    case KnobKind::volume:
      hookup.volume.dial = dial;
      break;
    case KnobKind::tone:
      hookup.tone.value().dial = dial;
      break;
    case KnobKind::second_volume:
      hookup.second.value().volume.value().dial = dial;
      break;
    case KnobKind::second_tone:
      hookup.second.value().tone.value().dial = dial;
      break;
    case KnobKind::blend:
      hookup.blend.value().dial = dial;
      break;
    case KnobKind::stage_volume:
      hookup.then.at(number).volume.value().dial = dial;
      break;
    case KnobKind::stage_tone:
      hookup.then.at(number).tone.value().dial = dial;
      break;
    case KnobKind::extra:
      hookup.extra.at(number).dial = dial;
      break;
  }
}

}  // namespace unsoldered
