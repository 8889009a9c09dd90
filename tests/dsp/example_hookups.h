// Hookups the dsp tests share, built as values: one of each kind, and random ones with extra parts.
#pragma once

#include <cmath>
#include <random>
#include <string>
#include <vector>

#include "dsp/hookup.h"

namespace unsoldered::test {

struct NamedHookup {
  std::string name;
  Hookup hookup;
};

inline Hookup pickup_hookup() {
  Hookup hookup;
  hookup.source.kind = SourceKind::pickup;
  hookup.source.resistance_ohm = 6200;
  hookup.source.inductance_h = 2.4;
  hookup.source.capacitance_f = 110e-12;
  hookup.source.loss_ohm = 300e3;
  hookup.volume.pot.total_ohm = 500e3;
  hookup.volume.pot.taper = parse_taper("audio 15%");
  hookup.cable = Cable{500e-12, {}};
  hookup.load.resistance_ohm = 1e6;
  hookup.load.capacitance_f = 20e-12;
  return hookup;
}

inline Hookup line_hookup(double source_ohm, double pot_ohm, double load_ohm) {
  Hookup hookup;
  hookup.source.kind = SourceKind::line;
  hookup.source.resistance_ohm = source_ohm;
  hookup.volume.pot.total_ohm = pot_ohm;
  hookup.load.resistance_ohm = load_ohm;
  return hookup;
}

inline Hookup piezo_hookup() {
  Hookup hookup;
  hookup.source.kind = SourceKind::piezo;
  hookup.source.capacitance_f = 1e-9;
  hookup.source.leak_ohm = 10e6;
  hookup.volume.pot.total_ohm = 1e6;
  hookup.load.resistance_ohm = 1e6;
  hookup.cable = Cable{500e-12, {}};
  return hookup;
}

inline ExtraPart extra_part(PartKind kind, double value, std::vector<std::string> between) {
  ExtraPart part;
  part.kind = kind;
  part.value = value;
  part.between = std::move(between);
  return part;
}

inline std::vector<NamedHookup> example_hookups() {
  std::vector<NamedHookup> all;
  all.push_back({"pickup", pickup_hookup()});
  Hookup every = pickup_hookup();
  every.treble_bleed = TrebleBleed{1e-9, 150e3, {}, {}};
  Tone tone;
  tone.pot = every.volume.pot;
  tone.capacitor_f = 22e-9;
  tone.dial = 6;
  every.tone = tone;
  every.load.coupling_f = 22e-9;
  all.push_back({"bleed, tone and coupling", every});
  Hookup bleed = pickup_hookup();
  bleed.treble_bleed = TrebleBleed{1e-9, {}, {}, {}};
  all.push_back({"bleed capacitor alone", bleed});
  Hookup series = pickup_hookup();
  series.treble_bleed = TrebleBleed{1.2e-9, {}, 130e3, {}};
  series.tone = tone;
  series.tone->position = TonePosition::output;
  all.push_back({"series bleed, tone at the output", series});
  Hookup wiper = pickup_hookup();
  wiper.volume.source_on = SourceOn::wiper;
  all.push_back({"source on the wiper", wiper});
  Hookup line = line_hookup(100, 10e3, 47e3);
  line.cable = Cable{300e-12, {}};
  all.push_back({"line", line});
  all.push_back({"ideal line", line_hookup(0, 10e3, 47e3)});
  all.push_back({"piezo", piezo_hookup()});
  Hookup lattice = pickup_hookup();  // a cutset of inductors, capacitors in series, a capacitor loop, a sealed charge
  lattice.extra.push_back(extra_part(PartKind::inductor, 1.5, {"source", "a"}));
  lattice.extra.push_back(extra_part(PartKind::inductor, 0.5, {"a", "b"}));
  lattice.extra.push_back(extra_part(PartKind::resistor, 47e3, {"b", "output"}));
  lattice.extra.push_back(extra_part(PartKind::capacitor, 1e-9, {"top", "c"}));
  lattice.extra.push_back(extra_part(PartKind::capacitor, 2.2e-9, {"c", "ground"}));
  lattice.extra.push_back(extra_part(PartKind::capacitor, 330e-12, {"source", "output"}));
  all.push_back({"lattice", lattice});
  return all;
}

/// Extra parts between random nodes, old and new, hung on one of the examples.
inline Hookup random_hookup(std::mt19937& random) {
  const std::vector<NamedHookup> examples = example_hookups();
  Hookup hookup = examples[random() % examples.size()].hookup;
  const auto log_uniform = [&](double low, double high) {
    return low * std::pow(high / low, std::uniform_real_distribution<double>(0, 1)(random));
  };
  std::vector<std::string> nodes{"ground", "source", "top", "wiper", "output", "grid"};
  const int parts = static_cast<int>(random() % 5);
  for (int i = 0; i < parts; ++i) {
    std::string a = nodes[random() % nodes.size()];
    std::string b = random() % 3 == 0 ? "extra" + std::to_string(i) : nodes[random() % nodes.size()];
    if (a == b) continue;
    if (b.starts_with("extra")) nodes.push_back(b);
    switch (random() % 3) {
      case 0:
        hookup.extra.push_back(extra_part(PartKind::resistor, log_uniform(1e3, 1e6), {a, b}));
        break;
      case 1:
        hookup.extra.push_back(extra_part(PartKind::capacitor, log_uniform(50e-12, 100e-9), {a, b}));
        break;
      default:
        hookup.extra.push_back(extra_part(PartKind::inductor, log_uniform(0.1, 10), {a, b}));
        hookup.extra.push_back(extra_part(PartKind::resistor, log_uniform(10e3, 1e6), {a, b}));
        break;
    }
  }
  return hookup;
}

}  // namespace unsoldered::test
