#include "dsp/hookup_network.h"

#include <algorithm>
#include <cmath>
#include <map>
#include <string>

namespace unsoldered {
namespace {

/// The circuit while it is drawn: nodes by name, and which network of the chain each is in.
class Drawing {
 public:
  explicit Drawing(const Hookup& hookup) : hookup_(hookup) { circuit_.stages.emplace_back(); }

  Node node(const std::string& name) {
    if (name != "ground") stage_of_.emplace(name, circuit_.stages.size() - 1);
    return network().node(name);
  }

  void add(BranchKind kind, const std::string& a, const std::string& b, double value, const std::string& name) {
    if (kind == BranchKind::capacitor && value == 0) return;
    network().branches.push_back({kind, node(a), node(b), value, name, after_output_});
  }

  /// A wire of the drawing, unless an extra part stands in its place.
  void wire(const std::string& a, const std::string& b) {
    for (const ExtraPart& part : hookup_.extra)
      if (part.in_place_of == a + "-" + b || part.in_place_of == b + "-" + a) {
        node(a);
        node(b);
        return;
      }
    add(BranchKind::resistor, a, b, 0, "wire from " + a + " to " + b);
  }

  void add(PotInNetwork pot) {
    pot.after_output = after_output_;
    network().pots.push_back(std::move(pot));
  }

  /// From here on: what an output impedance does not see.
  void pass_output() {
    network().output = node("output");
    after_output_ = true;
  }

  /// Ends this network at `grid` and starts the next, driven through an amplifier at its node `emf`.
  void amplify(const std::string& grid, double gain, const std::string& emf) {
    network().grid = node(grid);
    circuit_.gains.push_back(gain);
    circuit_.stages.emplace_back();
    network().emf = node(emf);
  }

  Circuit finish(const std::string& grid, double gain) {
    network().grid = node(grid);
    circuit_.gains.push_back(gain);
    add_extras();
    for (const Network& network : circuit_.stages) require_no_loose_parts(network);
    return std::move(circuit_);
  }

  Network& network() { return circuit_.stages.back(); }

 private:
  void add_extras();
  void add_extra(Network& network, const ExtraPart& part, std::size_t number);
  std::optional<std::size_t> stage_of(const ExtraPart& part, std::size_t number) const;

  const Hookup& hookup_;
  Circuit circuit_;
  std::map<std::string, std::size_t> stage_of_;
  bool after_output_ = false;
};

std::string part_name(const ExtraPart& part, std::size_t number) {
  const char* kind = part.kind == PartKind::resistor    ? "resistor"
                     : part.kind == PartKind::capacitor ? "capacitor"
                     : part.kind == PartKind::inductor  ? "inductor"
                                                        : "pot";
  return "extra " + std::string(kind) + " " + std::to_string(number + 1);
}

/// The network that holds the known nodes of a part; empty when it only has new nodes (and ground, which is in all).
std::optional<std::size_t> Drawing::stage_of(const ExtraPart& part, std::size_t number) const {
  std::optional<std::size_t> found;
  for (const std::string& name : part.between) {
    const auto known = stage_of_.find(name);
    if (known == stage_of_.end()) continue;
    if (found && *found != known->second)
      throw HookupError(
          "extra." + std::to_string(number) + ".between",
          "the part leads past a buffer, from \"" + part.between.front() + "\" to \"" + part.between.back() +
              "\"; a buffer is computed as an amplifier that nothing bridges: keep the part on one side of it");
    found = known->second;
  }
  return found;
}

void Drawing::add_extras() {
  // Parts that hang on new nodes find their network through other parts; what finds none stays with the first.
  std::vector<std::size_t> left(hookup_.extra.size());
  for (std::size_t i = 0; i < left.size(); ++i) left[i] = i;
  while (!left.empty()) {
    const auto placed =
        std::find_if(left.begin(), left.end(), [&](std::size_t i) { return stage_of(hookup_.extra[i], i); });
    const std::size_t number = placed == left.end() ? left.front() : *placed;
    const ExtraPart& part = hookup_.extra[number];
    const std::size_t stage = stage_of(part, number).value_or(0);
    for (const std::string& name : part.between)
      if (name != "ground") stage_of_.emplace(name, stage);
    add_extra(circuit_.stages[stage], part, number);
    left.erase(placed == left.end() ? left.begin() : placed);
  }
}

void Drawing::add_extra(Network& network, const ExtraPart& part, std::size_t number) {
  const std::string name = part_name(part, number);
  if (part.kind == PartKind::pot) {
    PotInNetwork pot;
    pot.pot = part.pot;
    pot.top = network.node(part.between[0]);
    pot.wiper = network.node(part.between[1]);
    pot.bottom = network.node(part.between[2]);
    pot.dial = part.dial;
    pot.knob = Knob{KnobKind::extra, static_cast<int>(number)};
    pot.name = name;
    network.pots.push_back(pot);
    return;
  }
  const BranchKind kind = part.kind == PartKind::resistor    ? BranchKind::resistor
                          : part.kind == PartKind::capacitor ? BranchKind::capacitor
                                                             : BranchKind::inductor;
  network.branches.push_back(
      {kind, network.node(part.between[0]), network.node(part.between[1]), part.value, name, false});
}

/// What tells one set of controls from another: names of its nodes and parts, and where its ground goes.
struct Names {
  std::string prefix;  // of nodes
  std::string spoken;  // of parts: "", "second ", "stage 1 "
  std::string ground;
};

void add_source(Drawing& drawing, const Source& source, const Names& names, const std::string& emf) {
  const std::string node = names.prefix + "source";
  const std::string spoken = names.spoken + "source ";
  switch (source.kind) {
    case SourceKind::pickup: {
      const std::string coil = names.prefix + "coil";
      drawing.add(BranchKind::resistor, emf, coil, source.resistance_ohm, spoken + "resistance");
      drawing.add(BranchKind::inductor, coil, node, source.inductance_h, spoken + "inductance");
      if (source.capacitance_f)
        drawing.add(BranchKind::capacitor, node, names.ground, *source.capacitance_f, spoken + "capacitance");
      if (source.loss_ohm)
        drawing.add(BranchKind::resistor, node, names.ground, *source.loss_ohm, spoken + "loss resistance");
      break;
    }
    case SourceKind::line:
      if (source.capacitance_f) {
        const std::string inside = names.prefix + "source_inside";
        drawing.add(BranchKind::resistor, emf, inside, source.resistance_ohm, spoken + "resistance");
        drawing.add(BranchKind::capacitor, inside, node, *source.capacitance_f, spoken + "capacitance");
      } else {
        drawing.add(BranchKind::resistor, emf, node, source.resistance_ohm, spoken + "resistance");
      }
      break;
    case SourceKind::piezo:
      drawing.add(BranchKind::capacitor, emf, node, source.capacitance_f.value_or(0), spoken + "capacitance");
      if (source.leak_ohm)
        drawing.add(BranchKind::resistor, node, names.ground, *source.leak_ohm, spoken + "leak resistance");
      break;
  }
}

void add_volume(Drawing& drawing, const Volume& volume, const Names& names, const Knob& knob, const std::string& from,
                const std::string& to) {
  const std::string top = names.prefix + "top";
  const std::string wiper = names.prefix + "wiper";
  const std::string bottom = names.prefix + "bottom";
  const bool on_top = volume.source_on == SourceOn::top;
  drawing.wire(from, on_top ? top : wiper);
  drawing.wire(on_top ? wiper : top, to);
  drawing.wire(bottom, names.ground);
  PotInNetwork pot;
  pot.pot = volume.pot;
  pot.top = drawing.node(top);
  pot.wiper = drawing.node(wiper);
  pot.bottom = drawing.node(bottom);
  pot.dial = volume.dial;
  pot.knob = knob;
  pot.name = names.spoken + "volume pot";
  drawing.add(std::move(pot));
}

void add_treble_bleed(Drawing& drawing, const TrebleBleed& bleed, const Names& names) {
  const std::string top = names.prefix + "top";
  const std::string wiper = names.prefix + "wiper";
  const std::string inside = bleed.series_ohm ? names.prefix + "treble_bleed_inside" : wiper;
  const std::string spoken = names.spoken + "treble bleed ";
  drawing.add(BranchKind::capacitor, top, inside, bleed.capacitor_f, spoken + "capacitor");
  if (bleed.series_ohm) drawing.add(BranchKind::resistor, inside, wiper, *bleed.series_ohm, spoken + "resistor");
  if (bleed.parallel_ohm) drawing.add(BranchKind::resistor, top, wiper, *bleed.parallel_ohm, spoken + "resistor");
}

void add_tone(Drawing& drawing, const Tone& tone, const Names& names, const Knob& knob, const std::string& from,
              const std::string& to) {
  const std::string inside = names.prefix + "tone_inside";
  PotInNetwork rheostat;
  rheostat.pot = tone.pot;
  rheostat.wiper = drawing.node(tone.position == TonePosition::source ? from : to);
  rheostat.bottom = drawing.node(inside);
  rheostat.dial = tone.dial;
  rheostat.open_at_ten = tone.no_load;
  rheostat.knob = knob;
  rheostat.name = names.spoken + "tone pot";
  drawing.add(std::move(rheostat));
  drawing.add(BranchKind::capacitor, inside, names.ground, tone.capacitor_f, names.spoken + "tone capacitor");
}

/// Both sources' outputs to the node "output".
void add_blend(Drawing& drawing, const Blend& blend) {
  PotInNetwork pot;
  pot.pot = blend.pot;
  pot.dial = blend.dial;
  pot.knob = Knob{KnobKind::blend};
  if (blend.law == BlendLaw::linear) {
    // At dial 0 the wiper is at the first source's end.
    pot.pot.taper = parse_taper("linear");
    pot.backwards = true;
    pot.top = drawing.node("first_output");
    pot.wiper = drawing.node("output");
    pot.bottom = drawing.node("second_output");
    pot.name = "blend pot";
    drawing.add(std::move(pot));
    return;
  }
  pot.pot.taper = Taper::two_sections({0.5, 1});
  pot.top = drawing.node("output");
  pot.bottom = drawing.node("ground");
  PotInNetwork second = pot;
  pot.backwards = true;
  pot.wiper = drawing.node("first_output");
  pot.name = "blend pot, first gang";
  second.wiper = drawing.node("second_output");
  second.name = "blend pot, second gang";
  drawing.add(std::move(pot));
  drawing.add(std::move(second));
}

void add_second(Drawing& drawing, const Hookup& hookup) {
  const SecondSource& second = *hookup.second;
  const Names names{"second_", "second ", "second_ground"};
  add_source(drawing, second.source, names, "emf2");
  if (second.volume)
    add_volume(drawing, *second.volume, names, {KnobKind::second_volume}, "second_source", "second_output");
  else
    drawing.wire("second_source", "second_output");
  if (second.treble_bleed) add_treble_bleed(drawing, *second.treble_bleed, names);
  if (second.tone) add_tone(drawing, *second.tone, names, {KnobKind::second_tone}, "second_source", "second_output");
  const bool in_series = hookup.selector.joined == Joined::series;
  drawing.wire("second_ground", in_series ? "first_output" : "ground");
  if (hookup.blend) return add_blend(drawing, *hookup.blend);
  if (!in_series && hookup.selector.use != SelectorUse::second) drawing.wire("first_output", "output");
  if (hookup.selector.use != SelectorUse::first) drawing.wire("second_output", "output");
}

/// Returns the node the stage ends at.
std::string add_stage(Drawing& drawing, const Stage& stage, std::size_t number, const std::string& from) {
  const std::string counted = std::to_string(number + 1);
  const Names names{"then" + counted + "_", "stage " + counted + " ", "ground"};
  const std::string to = names.prefix + "output";
  const int knob_number = static_cast<int>(number);
  if (stage.buffer) {
    const Buffer& buffer = *stage.buffer;
    drawing.add(BranchKind::resistor, from, "ground", buffer.input_ohm, names.spoken + "buffer input resistance");
    drawing.add(BranchKind::capacitor, from, "ground", buffer.input_f, names.spoken + "buffer input capacitance");
    drawing.amplify(from, std::pow(10, buffer.gain_db / 20), names.prefix + "buffer");
    drawing.add(BranchKind::resistor, names.prefix + "buffer", to, buffer.output_ohm,
                names.spoken + "buffer output resistance");
  } else if (stage.volume) {
    add_volume(drawing, *stage.volume, names, {KnobKind::stage_volume, knob_number}, from, to);
  } else {
    drawing.wire(from, to);
  }
  if (stage.treble_bleed) add_treble_bleed(drawing, *stage.treble_bleed, names);
  if (stage.tone) add_tone(drawing, *stage.tone, names, {KnobKind::stage_tone, knob_number}, from, to);
  if (stage.cable)
    drawing.add(BranchKind::capacitor, to, "ground", stage.cable->capacitance_f, names.spoken + "cable capacitance");
  return to;
}

}  // namespace

Circuit hookup_circuit(const Hookup& hookup, Driven driven) {
  Drawing drawing(hookup);
  for (const char* name : {"ground", "emf", "source", "top", "wiper", "bottom", "output"}) drawing.node(name);
  const Names names{"", "", "ground"};
  const std::string first_output = hookup.second ? "first_output" : "output";
  add_source(drawing, hookup.source, names, "emf");
  add_volume(drawing, hookup.volume, names, Knob::volume, "source", first_output);
  if (hookup.treble_bleed) add_treble_bleed(drawing, *hookup.treble_bleed, names);
  if (hookup.tone) add_tone(drawing, *hookup.tone, names, Knob::tone, "source", first_output);
  if (hookup.second) add_second(drawing, hookup);

  Network& network = drawing.network();
  const bool second_driven = driven == Driven::second && hookup.second;
  network.emf = drawing.node(second_driven ? "emf2" : "emf");
  network.emf_return = drawing.node(second_driven ? "second_ground" : "ground");
  if (hookup.second) {
    const std::string resting = second_driven ? "emf" : "emf2";
    drawing.add(BranchKind::resistor, resting, second_driven ? "ground" : "second_ground", 0, "generator at rest");
  }

  drawing.pass_output();
  if (hookup.cable)
    drawing.add(BranchKind::capacitor, "output", "ground", hookup.cable->capacitance_f, "cable capacitance");
  std::string last = "output";
  for (std::size_t i = 0; i < hookup.then.size(); ++i) last = add_stage(drawing, hookup.then[i], i, last);
  const Load& load = hookup.load;
  if (load.coupling_f)
    drawing.add(BranchKind::capacitor, last, "grid", *load.coupling_f, "coupling capacitor");
  else
    drawing.wire(last, "grid");
  drawing.add(BranchKind::resistor, "grid", "ground", load.resistance_ohm, "load resistance");
  drawing.add(BranchKind::capacitor, "grid", "ground", load.capacitance_f, "load capacitance");
  return drawing.finish("grid", second_driven && hookup.selector.out_of_phase ? -1 : 1);
}

Circuit hookup_circuit(const Hookup& hookup) { return hookup_circuit(hookup, driven_source(hookup)); }

Circuit hookup_circuit(const Hookup& hookup, double dial) {
  Hookup turned = hookup;
  turned.volume.dial = dial;
  return hookup_circuit(turned);
}

Network hookup_network(const Hookup& hookup) {
  Circuit circuit = hookup_circuit(hookup);
  if (circuit.stages.size() > 1) throw InputError("a hookup with buffers is several networks");
  return std::move(circuit.stages.front());
}

Network hookup_network(const Hookup& hookup, double dial) {
  Hookup turned = hookup;
  turned.volume.dial = dial;
  return hookup_network(turned);
}

}  // namespace unsoldered
