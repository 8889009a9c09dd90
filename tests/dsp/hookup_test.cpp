// Rules between the values of a hookup, its wires, bands and knobs.
#include "dsp/hookup.h"

#include <string>
#include <vector>

#include "tests/catch.h"

using Catch::Matchers::ContainsSubstring;
using unsoldered::ExtraPart;
using unsoldered::Hookup;
using unsoldered::HookupError;
using unsoldered::Knob;
using unsoldered::PartKind;
using unsoldered::SourceKind;
using unsoldered::SourceOn;
using unsoldered::Tone;

namespace {

Hookup plain_hookup() {
  Hookup hookup;
  hookup.source.kind = SourceKind::pickup;
  hookup.source.resistance_ohm = 6200;
  hookup.source.inductance_h = 2.4;
  hookup.source.capacitance_f = 110e-12;
  hookup.volume.pot.total_ohm = 500e3;
  hookup.load.resistance_ohm = 1e6;
  return hookup;
}

ExtraPart resistor(const std::vector<std::string>& between, const std::string& in_place_of = "") {
  ExtraPart part;
  part.kind = PartKind::resistor;
  part.value = 100e3;
  part.between = between;
  part.in_place_of = in_place_of;
  return part;
}

std::string key_of_refusal(const Hookup& hookup) {
  try {
    unsoldered::validate(hookup);
  } catch (const HookupError& error) {
    return error.key();
  }
  return "";
}

std::vector<std::string> wire_names(const Hookup& hookup) {
  std::vector<std::string> names;
  for (const unsoldered::Wire& wire : unsoldered::replaceable_wires(hookup)) {
    names.push_back(wire.name());
  }
  return names;
}

}  // namespace

TEST_CASE("Listening bands follow the kind of source unless set") {
  Hookup hookup = plain_hookup();
  CHECK(unsoldered::listening_bands(hookup).treble.from_hz == 2000);
  CHECK(unsoldered::listening_bands(hookup).treble.to_hz == 5000);
  CHECK(unsoldered::listening_bands(hookup).body.from_hz == 200);
  CHECK(unsoldered::listening_bands(hookup).body.to_hz == 800);
  hookup.source.kind = SourceKind::piezo;
  CHECK(unsoldered::listening_bands(hookup).treble.from_hz == 2000);
  hookup.source.kind = SourceKind::line;
  CHECK(unsoldered::listening_bands(hookup).treble.from_hz == 5000);
  CHECK(unsoldered::listening_bands(hookup).treble.to_hz == 15000);
  hookup.listening = unsoldered::Listening{{1000, 4000}, {100, 300}};
  CHECK(unsoldered::listening_bands(hookup).treble.from_hz == 1000);
  CHECK(unsoldered::listening_bands(hookup).body.to_hz == 300);
}

TEST_CASE("A knob is known when the hookup has it") {
  Hookup hookup = plain_hookup();
  CHECK(unsoldered::parse_knob(hookup, "volume") == Knob::volume);
  CHECK_THROWS_WITH(unsoldered::parse_knob(hookup, "tone"), ContainsSubstring("[tone]"));
  CHECK_THROWS_WITH(unsoldered::parse_knob(hookup, "mid"), ContainsSubstring("\"mid\"") && ContainsSubstring("volume"));
  hookup.tone = Tone{};
  CHECK(unsoldered::parse_knob(hookup, "tone") == Knob::tone);
  CHECK_THROWS_AS(unsoldered::parse_knob(hookup, "Volume"), unsoldered::InputError);
}

TEST_CASE("Wires that may be replaced follow the wiring") {
  Hookup hookup = plain_hookup();
  CHECK(wire_names(hookup) == std::vector<std::string>{"source-top", "wiper-output", "bottom-ground", "output-grid"});
  hookup.volume.source_on = SourceOn::wiper;
  hookup.load.coupling_f = 22e-9;
  CHECK(wire_names(hookup) == std::vector<std::string>{"source-wiper", "top-output", "bottom-ground"});
  CHECK(unsoldered::find_wire(hookup, "output-top")->name() == "top-output");
  CHECK_FALSE(unsoldered::find_wire(hookup, "source-top").has_value());
  CHECK_FALSE(unsoldered::find_wire(hookup, "").has_value());
}

TEST_CASE("A sound hookup passes") {
  Hookup hookup = plain_hookup();
  hookup.volume.pot.end_ohm = 50;
  hookup.volume.pot.dead_ccw_deg = 15;
  hookup.extra = {resistor({"wiper", "ground"}), resistor({"source", "x1"}, "source-top"), resistor({"x1", "top"})};
  CHECK_NOTHROW(unsoldered::validate(hookup));
}

TEST_CASE("Rules between values name the key that breaks them") {
  Hookup hookup = plain_hookup();
  hookup.volume.pot.end_ohm = 250e3;
  CHECK(key_of_refusal(hookup) == "volume.end_resistance");
  hookup = plain_hookup();
  hookup.volume.pot.dead_ccw_deg = 200;
  hookup.volume.pot.dead_cw_deg = 100;
  CHECK(key_of_refusal(hookup) == "volume.dead_travel");
  hookup = plain_hookup();
  hookup.volume.pot.total_ohm = 0;
  CHECK(key_of_refusal(hookup) == "volume.resistance");
  hookup = plain_hookup();
  hookup.tone = Tone{};
  hookup.tone->pot.total_ohm = 250e3;
  hookup.tone->dial = 11;
  CHECK(key_of_refusal(hookup) == "tone.dial");
  hookup = plain_hookup();
  hookup.treble_bleed = unsoldered::TrebleBleed{1e-9, 150e3, 100e3, {}};
  CHECK(key_of_refusal(hookup) == "treble_bleed.series_resistor");
  hookup = plain_hookup();
  hookup.listening = unsoldered::Listening{{5000, 2000}, {200, 800}};
  CHECK(key_of_refusal(hookup) == "listening.treble_band");
  hookup = plain_hookup();
  hookup.source.kind = SourceKind::piezo;
  hookup.source.capacitance_f.reset();
  CHECK(key_of_refusal(hookup) == "source.capacitance");
}

TEST_CASE("Places of extra parts are checked") {
  struct Row {
    ExtraPart part;
    std::string key;
  };
  ExtraPart pot = resistor({"wiper", "ground"});
  pot.kind = PartKind::pot;
  pot.pot.total_ohm = 10e3;
  ExtraPart nothing = resistor({"wiper", "ground"});
  nothing.kind = PartKind::capacitor;
  nothing.value = 0;
  const std::vector<Row> rows = {{resistor({}), "extra.0.between"},
                                 {resistor({"wiper"}), "extra.0.between"},
                                 {resistor({"wiper", "ground", "top"}), "extra.0.between"},
                                 {resistor({"wiper", "wiper"}), "extra.0.between"},
                                 {resistor({"wiper", "Ground"}), "extra.0.between"},
                                 {resistor({"wiper", ""}), "extra.0.between"},
                                 {resistor({"wiper", "gr ound"}), "extra.0.between"},
                                 {resistor({"wiper", "tone_inside"}), "extra.0.between"},
                                 {resistor({"wipr", "ground"}), "extra.0.between"},
                                 {resistor({"wiper", "gruond"}), "extra.0.between"},
                                 {resistor({"source", "top"}, "source-output"), "extra.0.in_place_of"},
                                 {pot, "extra.0.between"},
                                 {nothing, "extra.0.value"}};
  for (const Row& row : rows) {
    Hookup hookup = plain_hookup();
    hookup.extra = {row.part};
    CAPTURE(row.part.between, row.part.in_place_of);
    CHECK(key_of_refusal(hookup) == row.key);
  }
  pot.between = {"wiper", "x1", "ground"};
  Hookup hookup = plain_hookup();
  hookup.extra = {pot};
  CHECK_NOTHROW(unsoldered::validate(hookup));
}

TEST_CASE("A misspelled node is asked about, a new name is not") {
  Hookup hookup = plain_hookup();
  hookup.extra = {resistor({"wipr", "ground"})};
  CHECK_THROWS_WITH(unsoldered::validate(hookup), ContainsSubstring("was \"wiper\" meant?"));
  hookup.extra = {resistor({"wipr", "ground"}), resistor({"top", "wipr"})};
  CHECK_NOTHROW(unsoldered::validate(hookup));  // two parts meet there, so it is a node of its own
}
