#include "dsp/hookup_network.h"

#include <string>

namespace unsoldered {
namespace {

void add(Network& network, BranchKind kind, const std::string& a, const std::string& b, double value,
         const std::string& name, bool after_output = false) {
  if (kind == BranchKind::capacitor && value == 0) return;
  network.branches.push_back({kind, network.node(a), network.node(b), value, name, after_output});
}

void add_source(Network& network, const Source& source) {
  switch (source.kind) {
    case SourceKind::pickup:
      add(network, BranchKind::resistor, "emf", "coil", source.resistance_ohm, "source resistance");
      add(network, BranchKind::inductor, "coil", "source", source.inductance_h, "source inductance");
      if (source.capacitance_f)
        add(network, BranchKind::capacitor, "source", "ground", *source.capacitance_f, "source capacitance");
      if (source.loss_ohm)
        add(network, BranchKind::resistor, "source", "ground", *source.loss_ohm, "source loss resistance");
      break;
    case SourceKind::line:
      if (source.capacitance_f) {
        add(network, BranchKind::resistor, "emf", "source_inside", source.resistance_ohm, "source resistance");
        add(network, BranchKind::capacitor, "source_inside", "source", *source.capacitance_f, "source capacitance");
      } else {
        add(network, BranchKind::resistor, "emf", "source", source.resistance_ohm, "source resistance");
      }
      break;
    case SourceKind::piezo:
      add(network, BranchKind::capacitor, "emf", "source", source.capacitance_f.value_or(0), "source capacitance");
      if (source.leak_ohm)
        add(network, BranchKind::resistor, "source", "ground", *source.leak_ohm, "source leak resistance");
      break;
  }
}

void add_treble_bleed(Network& network, const TrebleBleed& bleed) {
  const std::string inside = bleed.series_ohm ? "treble_bleed_inside" : "wiper";
  add(network, BranchKind::capacitor, "top", inside, bleed.capacitor_f, "treble bleed capacitor");
  if (bleed.series_ohm) add(network, BranchKind::resistor, inside, "wiper", *bleed.series_ohm, "treble bleed resistor");
  if (bleed.parallel_ohm)
    add(network, BranchKind::resistor, "top", "wiper", *bleed.parallel_ohm, "treble bleed resistor");
}

void add_tone(Network& network, const Tone& tone) {
  PotInNetwork rheostat;
  rheostat.pot = tone.pot;
  rheostat.wiper = network.node(tone.position == TonePosition::source ? "source" : "output");
  rheostat.bottom = network.node("tone_inside");
  rheostat.dial = tone.dial;
  rheostat.open_at_ten = tone.no_load;
  rheostat.knob = Knob::tone;
  rheostat.name = "tone pot";
  network.pots.push_back(rheostat);
  add(network, BranchKind::capacitor, "tone_inside", "ground", tone.capacitor_f, "tone capacitor");
}

void add_load(Network& network, const Load& load) {
  if (load.coupling_f)
    add(network, BranchKind::capacitor, "output", "grid", *load.coupling_f, "coupling capacitor", true);
  add(network, BranchKind::resistor, "grid", "ground", load.resistance_ohm, "load resistance", true);
  add(network, BranchKind::capacitor, "grid", "ground", load.capacitance_f, "load capacitance", true);
}

std::string part_name(const ExtraPart& part, std::size_t number) {
  const char* kind = part.kind == PartKind::resistor    ? "resistor"
                     : part.kind == PartKind::capacitor ? "capacitor"
                     : part.kind == PartKind::inductor  ? "inductor"
                                                        : "pot";
  return "extra " + std::string(kind) + " " + std::to_string(number + 1);
}

void add_extra(Network& network, const ExtraPart& part, std::size_t number) {
  const std::string name = part_name(part, number);
  if (part.kind == PartKind::pot) {
    PotInNetwork pot;
    pot.pot = part.pot;
    pot.top = network.node(part.between[0]);
    pot.wiper = network.node(part.between[1]);
    pot.bottom = network.node(part.between[2]);
    pot.dial = part.dial;
    pot.name = name;
    network.pots.push_back(pot);
    return;
  }
  const BranchKind kind = part.kind == PartKind::resistor    ? BranchKind::resistor
                          : part.kind == PartKind::capacitor ? BranchKind::capacitor
                                                             : BranchKind::inductor;
  add(network, kind, part.between[0], part.between[1], part.value, name);
}

/// A wire of the drawing, unless an extra part stands in its place.
void add_wire(Network& network, const Hookup& hookup, const std::string& a, const std::string& b) {
  for (const ExtraPart& part : hookup.extra)
    if (part.in_place_of == a + "-" + b || part.in_place_of == b + "-" + a) return;
  add(network, BranchKind::resistor, a, b, 0, "wire from " + a + " to " + b);
}

}  // namespace

Network hookup_network(const Hookup& hookup) {
  Network network;
  for (const char* name : {"ground", "emf", "source", "top", "wiper", "bottom", "output", "grid"}) network.node(name);
  network.emf = network.node("emf");
  network.output = network.node("output");
  network.grid = network.node("grid");

  add_source(network, hookup.source);
  const bool on_top = hookup.volume.source_on == SourceOn::top;
  add_wire(network, hookup, "source", on_top ? "top" : "wiper");
  add_wire(network, hookup, on_top ? "wiper" : "top", "output");
  add_wire(network, hookup, "bottom", "ground");

  PotInNetwork volume;
  volume.pot = hookup.volume.pot;
  volume.top = network.node("top");
  volume.wiper = network.node("wiper");
  volume.bottom = network.node("bottom");
  volume.knob = Knob::volume;
  volume.name = "volume pot";
  network.pots.push_back(volume);

  if (hookup.treble_bleed) add_treble_bleed(network, *hookup.treble_bleed);
  if (hookup.tone) add_tone(network, *hookup.tone);
  if (hookup.cable)
    add(network, BranchKind::capacitor, "output", "ground", hookup.cable->capacitance_f, "cable capacitance", true);
  if (!hookup.load.coupling_f) add_wire(network, hookup, "output", "grid");
  add_load(network, hookup.load);
  for (std::size_t i = 0; i < hookup.extra.size(); ++i) add_extra(network, hookup.extra[i], i);
  require_no_loose_parts(network);
  return network;
}

Network hookup_network(const Hookup& hookup, double dial) {
  Network network = hookup_network(hookup);
  set_dial(network, Knob::volume, dial);
  return network;
}

}  // namespace unsoldered
