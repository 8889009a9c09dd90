// Hookup files: the whole format is read, every refusal names place, key, value and what is accepted.
#include "src/hookup_file.h"

#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <random>
#include <string>
#include <vector>

#include "dsp/error.h"
#include "src/hookup_measured.h"
#include "tests/catch.h"

using Catch::Matchers::ContainsSubstring;
using Catch::Matchers::WithinAbs;
using Catch::Matchers::WithinRel;
using unsoldered::Hookup;
using unsoldered::InputError;
using unsoldered::parse_hookup;
using unsoldered::PartKind;
using unsoldered::SourceKind;
using unsoldered::SourceOn;
using unsoldered::TonePosition;

namespace {

namespace fs = std::filesystem;

const std::string kLine = R"([source]
kind = "line"
resistance = "100"
[volume]
resistance = "10k"
taper = "linear"
[load]
resistance = "47k"
)";

const std::string kPickup = R"([source]
kind = "pickup"
inductance = "2.4 H"
resistance = "6k2"
capacitance = "110 pF"
loss_resistance = "300k"
[volume]
resistance = "500k"
taper = "audio 15%"
[tone]
resistance = "500k"
taper = "audio 15%"
capacitor = "22n"
[cable]
length = "5 m"
capacitance_per_metre = "100 pF"
[load]
resistance = "1M"
)";

Hookup parse(const std::string& toml, const std::vector<std::string>& settings = {}) {
  return parse_hookup(toml, "bench.hookup.toml", ".", settings);
}

std::string refusal(const std::string& toml, const std::vector<std::string>& settings = {}) {
  try {
    parse(toml, settings);
  } catch (const InputError& error) {
    return error.what();
  }
  return "accepted";
}

std::string replaced(std::string text, const std::string& from, const std::string& to) {
  const std::size_t at = text.find(from);
  if (at == std::string::npos) {
    throw std::logic_error("no " + from);
  }
  return text.replace(at, from.size(), to);
}

/// A folder of its own that goes away again.
class Folder {
 public:
  Folder() : path_(fs::temp_directory_path() / ("unsoldered-test-" + std::to_string(::getpid()) + "-" + unique())) {
    fs::create_directories(path_);
  }
  Folder(const Folder&) = delete;
  Folder& operator=(const Folder&) = delete;
  ~Folder() {
    std::error_code ignored;
    fs::remove_all(path_, ignored);
  }
  fs::path write(const std::string& name, const std::string& text) const {
    fs::create_directories((path_ / name).parent_path());
    std::ofstream(path_ / name, std::ios::binary) << text;
    return path_ / name;
  }
  const fs::path& path() const { return path_; }

 private:
  static std::string unique() { return std::to_string(std::random_device{}()); }
  fs::path path_;
};

}  // namespace

TEST_CASE("The whole hookup format is read") {
  const Hookup hookup = parse(R"(
title = "Single coil, 500k audio, 5 m cable"
[source]
kind = "pickup"
inductance = "2.4 H"
resistance = "6k2"
capacitance = "110 pF"
loss_resistance = "300k"
tolerance = "10%"
[volume]
resistance = "500k"
taper = "audio 15%"
source_on = "wiper"
travel = 280
dead_travel = [15, 10]
end_resistance = "50"
tolerance = "20%"
[treble_bleed]
capacitor = "1n"
parallel_resistor = "150k"
[tone]
resistance = "250k"
taper = "ideal audio 10%"
capacitor = "22n"
position = "output"
dial = 4.5
no_load = true
dead_travel = 12
[cable]
length = "5 m"
capacitance_per_metre = "100 pF"
[load]
resistance = "1M"
capacitance = "20 pF"
coupling = "22n"
[listening]
treble_band = ["3k", 6000]
[[extra]]
part = "resistor"
value = "22k"
between = ["wiper", "ground"]
[[extra]]
part = "pot"
value = "10k"
between = ["source", "x1", "ground"]
taper = "linear"
dial = 3
[[extra]]
part = "capacitor"
value = "470p"
in_place_of = "output-top"
)");
  CHECK(hookup.title == "Single coil, 500k audio, 5 m cable");
  CHECK(hookup.source.kind == SourceKind::pickup);
  CHECK(hookup.source.inductance_h == 2.4);
  CHECK(hookup.source.resistance_ohm == 6200);
  CHECK(hookup.source.capacitance_f == 110e-12);
  CHECK(hookup.source.loss_ohm == 300e3);
  CHECK(hookup.source.tolerance == 0.1);
  CHECK(hookup.volume.pot.total_ohm == 500e3);
  CHECK(hookup.volume.pot.taper.name() == "audio 15%");
  CHECK(hookup.volume.source_on == SourceOn::wiper);
  CHECK(hookup.volume.pot.travel_deg == 280);
  CHECK(hookup.volume.pot.dead_ccw_deg == 15);
  CHECK(hookup.volume.pot.dead_cw_deg == 10);
  CHECK(hookup.volume.pot.end_ohm == 50);
  CHECK(hookup.volume.pot.tolerance == 0.2);
  REQUIRE(hookup.treble_bleed);
  CHECK(hookup.treble_bleed->capacitor_f == 1e-9);
  CHECK(hookup.treble_bleed->parallel_ohm == 150e3);
  CHECK_FALSE(hookup.treble_bleed->series_ohm.has_value());
  REQUIRE(hookup.tone);
  CHECK(hookup.tone->pot.total_ohm == 250e3);
  CHECK(hookup.tone->pot.taper.name() == "ideal audio 10%");
  CHECK(hookup.tone->pot.dead_ccw_deg == 12);
  CHECK(hookup.tone->pot.dead_cw_deg == 12);
  CHECK(hookup.tone->capacitor_f == 22e-9);
  CHECK(hookup.tone->position == TonePosition::output);
  CHECK(hookup.tone->dial == 4.5);
  CHECK(hookup.tone->no_load);
  REQUIRE(hookup.cable);
  CHECK_THAT(hookup.cable->capacitance_f, WithinRel(500e-12, 1e-15));
  CHECK(hookup.load.resistance_ohm == 1e6);
  CHECK(hookup.load.capacitance_f == 20e-12);
  CHECK(hookup.load.coupling_f == 22e-9);
  REQUIRE(hookup.listening);
  CHECK(hookup.listening->treble.from_hz == 3000);
  CHECK(hookup.listening->treble.to_hz == 6000);
  CHECK(hookup.listening->body.from_hz == 200);
  REQUIRE(hookup.extra.size() == 3);
  CHECK(hookup.extra[0].kind == PartKind::resistor);
  CHECK(hookup.extra[0].value == 22e3);
  CHECK(hookup.extra[1].kind == PartKind::pot);
  CHECK(hookup.extra[1].pot.total_ohm == 10e3);
  CHECK(hookup.extra[1].dial == 3);
  CHECK(hookup.extra[1].between == std::vector<std::string>{"source", "x1", "ground"});
  CHECK(hookup.extra[2].in_place_of == "top-output");
  CHECK(hookup.extra[2].between == std::vector<std::string>{"top", "output"});
}

TEST_CASE("What is left out has its default") {
  const Hookup hookup = parse(kPickup);
  CHECK(hookup.title.empty());
  CHECK(hookup.volume.source_on == SourceOn::top);
  CHECK(hookup.volume.pot.travel_deg == 300);
  CHECK(hookup.volume.pot.dead_ccw_deg == 0);
  CHECK(hookup.volume.pot.end_ohm == 0);
  CHECK_FALSE(hookup.volume.pot.tolerance.has_value());
  CHECK(hookup.tone->dial == 10);
  CHECK(hookup.tone->position == TonePosition::source);
  CHECK_FALSE(hookup.tone->no_load);
  CHECK(hookup.load.capacitance_f == 0);
  CHECK_FALSE(hookup.load.coupling_f.has_value());
  CHECK_FALSE(hookup.treble_bleed.has_value());
  CHECK_FALSE(hookup.listening.has_value());
  CHECK(hookup.extra.empty());
}

TEST_CASE("Line and piezo sources are read") {
  Hookup hookup = parse(kLine);
  CHECK(hookup.source.kind == SourceKind::line);
  CHECK(hookup.source.resistance_ohm == 100);
  CHECK_FALSE(hookup.source.capacitance_f.has_value());
  hookup = parse(kLine, {"source.resistance=0", "source.capacitance=1uF"});
  CHECK(hookup.source.resistance_ohm == 0);
  CHECK(hookup.source.capacitance_f == 1e-6);
  hookup = parse(replaced(kLine, "kind = \"line\"\nresistance = \"100\"", "kind = \"piezo\"\ncapacitance = \"1n\""));
  CHECK(hookup.source.kind == SourceKind::piezo);
  CHECK(hookup.source.capacitance_f == 1e-9);
  CHECK_FALSE(hookup.source.leak_ohm.has_value());
  hookup = parse(replaced(kPickup, "\"300k\"", "\"none\""));
  CHECK_FALSE(hookup.source.loss_ohm.has_value());
}

TEST_CASE("Bare numbers are in the base unit") {
  const Hookup hookup = parse(replaced(replaced(kPickup, "\"2.4 H\"", "2.4"), "\"22n\"", "22e-9"));
  CHECK(hookup.source.inductance_h == 2.4);
  CHECK(hookup.tone->capacitor_f == 22e-9);
}

TEST_CASE("A cable is a length and a capacitance per metre, or one reading") {
  const std::string reading =
      replaced(kPickup, "length = \"5 m\"\ncapacitance_per_metre = \"100 pF\"", "capacitance = \"680 pF\"");
  CHECK(parse(reading).cable->capacitance_f == 680e-12);
  CHECK_THAT(parse(kPickup, {"cable.length=18 ft"}).cable->capacitance_f, WithinRel(548.64e-12, 1e-12));
  CHECK_THAT(parse(kPickup, {"cable.capacitance_per_metre=130 pF/m"}).cable->capacitance_f, WithinRel(650e-12, 1e-12));
  // RG-58: 30.86 pF/ft is 101.23 pF/m, calculated from its 50 ohm and velocity factor 0.659.
  CHECK_THAT(parse(kPickup, {"cable.capacitance_per_metre=30.86 pF/ft", "cable.length=1"}).cable->capacitance_f,
             WithinAbs(101.23e-12, 0.02e-12));
  CHECK_THAT(refusal(kPickup, {"cable.capacitance=680 pF"}),
             ContainsSubstring("cable.capacitance") && ContainsSubstring("one of"));
  CHECK_THAT(refusal(reading, {"cable.length=5"}),
             ContainsSubstring("cable.capacitance") && ContainsSubstring("one of"));
  CHECK_THAT(refusal(replaced(kPickup, "length = \"5 m\"\n", "")), ContainsSubstring("\"cable.length\" is missing"));
  CHECK_THAT(refusal(replaced(kPickup, "capacitance_per_metre = \"100 pF\"\n", "")),
             ContainsSubstring("\"cable.capacitance_per_metre\" is missing"));
}

TEST_CASE("Tapers are read in all their forms") {
  CHECK(parse(kLine, {"volume.taper=ideal reverse audio 20%"}).volume.pot.taper.name() == "ideal reverse audio 20%");
  const Hookup hookup = parse(kLine, {"volume.taper={sections=[[0,0],[0.6,0.2],[0.95,1],[1,1]]}"});
  CHECK_THAT(hookup.volume.pot.taper.share(0.3), WithinAbs(0.1, 1e-12));
  CHECK_THAT(refusal(kLine, {"volume.taper={sections=[[0,0],[0.6,0.2]]}"}), ContainsSubstring("volume.taper.sections"));
  CHECK_THAT(refusal(kLine, {"volume.taper={sections=[[0,0],[0.6,-0.2],[1,1]]}"}), ContainsSubstring("-0.2"));
  CHECK_THAT(refusal(kLine, {"volume.taper={sections=[[0,0],[0.6],[1,1]]}"}),
             ContainsSubstring("entry 2 is not a pair"));
  CHECK_THAT(refusal(kLine, {"volume.taper={sections=5}"}), ContainsSubstring("5 cannot stand here"));
  CHECK_THAT(refusal(kLine, {"volume.taper={}"}), ContainsSubstring("is missing"));
  CHECK_THAT(refusal(kLine, {"volume.taper={section=[]}"}), ContainsSubstring("was \"sections\" meant?"));
  CHECK_THAT(refusal(kLine, {"volume.taper=5"}), ContainsSubstring("volume.taper") && ContainsSubstring("\"linear\""));
  CHECK_THAT(refusal(kLine, {"volume.taper=A"}), ContainsSubstring("conventions disagree"));
  CHECK_THAT(refusal(kLine, {"volume.taper=audio"}), ContainsSubstring("usual are"));
}

TEST_CASE("Ohmmeter readings beat the name, and a letter too") {
  const std::vector<std::string> readings = {"volume.measured_total=463k", "volume.measured_half=58k"};
  for (const std::string taper : {"linear", "audio 30%", "A", "B500k"}) {
    std::vector<std::string> settings = readings;
    settings.push_back("volume.taper=" + taper);
    const Hookup hookup = parse(kLine, settings);
    CHECK(hookup.volume.pot.total_ohm == 463e3);
    CHECK_THAT(unsoldered::element_fraction(hookup.volume.pot, 5) * 463e3, WithinAbs(58e3, 1e-6));
    CHECK_THAT(hookup.volume.pot.taper.share(0.25), WithinAbs(0.5 * 58 / 463, 1e-12));  // straight sections
  }
  const Hookup ideal = parse(kLine, {readings[0], readings[1], "volume.taper=ideal audio 15%"});
  CHECK_THAT(unsoldered::element_fraction(ideal.volume.pot, 5) * 463e3, WithinAbs(58e3, 1e-6));
  CHECK(ideal.volume.pot.taper.share(0.25) < 0.05);

  const std::string only =
      replaced(kLine, "resistance = \"10k\"\ntaper = \"linear\"", "measured_total = \"463k\"\nmeasured_half = \"58k\"");
  CHECK(parse(only).volume.pot.total_ohm == 463e3);
  CHECK_THAT(unsoldered::element_fraction(
                 parse(only, {"volume.end_resistance=40", "volume.dead_travel=[20,5]"}).volume.pot, 5),
             WithinAbs(58.0 / 463, 1e-12));
  CHECK_THAT(refusal(only, {"volume.measured_half=500k"}),
             ContainsSubstring("volume.measured_half") && ContainsSubstring("463k"));
  CHECK_THAT(refusal(only, {"volume.taper={sections=[[0,0],[1,1]]}"}), ContainsSubstring("take one of them out"));
  CHECK_THAT(refusal(only, {"volume.taper=nonsense"}), ContainsSubstring("nonsense"));
  CHECK_THAT(refusal(replaced(only, "measured_half = \"58k\"", "")), ContainsSubstring("\"volume.taper\" is missing"));
}

TEST_CASE("Refusals name file, line, key, value and what is accepted") {
  CHECK_THAT(refusal(replaced(kPickup, "resistance = \"500k\"\ntaper", "resistance = \"5 F\"\ntaper")),
             ContainsSubstring("bench.hookup.toml:8: key \"volume.resistance\": \"5 F\"") && ContainsSubstring("500k"));
  CHECK_THAT(refusal(replaced(kPickup, "\"500k\"", "\"500 Gohm\"")),
             ContainsSubstring("bench.hookup.toml:8") && ContainsSubstring("10 ohm to 100M"));
  CHECK_THAT(refusal(replaced(kPickup, "resistance = \"500k\"", "resistence = \"500k\"")),
             ContainsSubstring("bench.hookup.toml:8: key \"volume.resistence\"") &&
                 ContainsSubstring("was \"resistance\" meant?") && ContainsSubstring("\"taper\""));
  CHECK_THAT(refusal(replaced(kPickup, "[cable]", "[cabel]")),
             ContainsSubstring("bench.hookup.toml:14: key \"cabel\"") && ContainsSubstring("was \"cable\" meant?"));
  CHECK_THAT(refusal(replaced(kPickup, "loss_resistance = \"300k\"\n", "")),
             ContainsSubstring("bench.hookup.toml:1: key \"source.loss_resistance\" is missing") &&
                 ContainsSubstring("\"none\""));
}

TEST_CASE("Missing blocks and keys are named") {
  CHECK_THAT(refusal(""), ContainsSubstring("block [source] is missing"));
  CHECK_THAT(refusal("[source]\nkind = \"line\"\nresistance = 0\n"), ContainsSubstring("block [volume] is missing"));
  CHECK_THAT(refusal(replaced(kLine, "[load]\nresistance = \"47k\"\n", "")),
             ContainsSubstring("block [load] is missing"));
  for (const std::string line :
       {"kind = \"pickup\"\n", "inductance = \"2.4 H\"\n", "resistance = \"6k2\"\n", "capacitance = \"110 pF\"\n",
        "loss_resistance = \"300k\"\n", "capacitor = \"22n\"\n", "resistance = \"1M\"\n"}) {
    CAPTURE(line);
    const std::string key = line.substr(0, line.find(' '));
    CHECK_THAT(refusal(replaced(kPickup, line, "")), ContainsSubstring("." + key + "\" is missing"));
  }
  CHECK_THAT(refusal(replaced(kLine, "resistance = \"10k\"\n", "")),
             ContainsSubstring("\"volume.resistance\" is missing"));
  CHECK_THAT(refusal(kLine + "[treble_bleed]\n"), ContainsSubstring("\"treble_bleed.capacitor\" is missing"));
  CHECK_THAT(refusal(kLine + "[[extra]]\n"), ContainsSubstring("\"extra.0.part\" is missing"));
  CHECK_THAT(refusal(kLine + "[[extra]]\npart = \"resistor\"\nvalue = 1\n"),
             ContainsSubstring("\"extra.0.between\" is missing"));
}

TEST_CASE("Impossible values and shapes are refused, none accepted or fatal") {
  struct Row {
    std::string setting;
    std::string part_of_message;
  };
  const std::vector<Row> rows = {
      {"volume.resistance=0", "10 ohm to 100M"},
      {"volume.resistance=-500k", "negative"},
      {"volume.resistance=1e12", "10 ohm to 100M"},
      {"volume.resistance=nan", "nan"},
      {"volume.resistance=inf", "inf"},
      {"volume.resistance=A500k", "taper letter"},
      {"volume.resistance=4,7k", "comma"},
      {"volume.resistance=", "empty"},
      {"volume.resistance=true", "true"},
      {"volume.resistance=[1]", "a list"},
      {"volume.resistance=2020-01-01", "a date or time"},
      {"volume.resistance={}", "a table"},
      {"volume.travel=5", "10 to 3600 degrees"},
      {"volume.travel=3601", "10 to 3600 degrees"},
      {"volume.dead_travel=150", "sum below the travel"},
      {"volume.dead_travel=[10]", "two"},
      {"volume.dead_travel=-1", "0 to 3600"},
      {"volume.end_resistance=250k", "below half"},
      {"volume.source_on=bottom", "\"top\", \"wiper\""},
      {"volume.tolerance=20", "\"20%\""},
      {"volume.tolerance=120%", "0% to 100%"},
      {"volume.right={resistance=5}", "5 ohm"},
      {"volume.dial=4", "--dial 7"},
      {"volume=5", "[volume]"},
      {"volume=big pot", "catalogue"},
      {"load=valve amplifier inputs", "catalogue"},
      {"load.resistance=0", "1 ohm to 10G"},
      {"load.resistance=none", "no number"},
      {"load.coupling=0", "0.01 pF"},
      {"load.capacitance=1 F", "10 mF"},
      {"source.kind=magnet", "\"pickup\", \"line\", \"piezo\""},
      {"source.kind=line", "not used by a line source"},
      {"source.inductance=0", "1 nH to 10000 H"},
      {"source.inductance=500k", "10000 H"},
      {"source.resistance=2 H", "an inductance"},
      {"source.loss_resistance=0", "1 ohm"},
      {"tone.dial=44", "0 to 10"},
      {"tone.dial=-0.1", "0 to 10"},
      {"tone.dial=seven", "not a number"},
      {"tone.dial=7,5", "comma"},
      {"tone.no_load=yes", "true or false"},
      {"tone.position=middle", "\"source\", \"output\""},
      {"tone.capacitor=22k", "prefix k"},
      {"tone.source_on=top", "not a key"},
      {"cable.length=2000 m", "1000 m"},
      {"cable.length=-1", "out of range"},
      {"treble_bleed={capacitor=\"1n\",parallel_resistor=\"1k\",series_resistor=\"1k\"}", "at most one"},
      {"title=\"two\\nlines\"", "control character"},
      {"title=5", "text"},
      {"extra=5", "[[extra]]"},
      {"extra=[5]", "[[extra]]"},
      {"extra=[{part=\"diode\"}]", "\"inductor\""},
      {"extra=[{part=\"resistor\",value=\"1n\",between=[\"top\",\"ground\"]}]", "a resistance"},
      {"extra=[{part=\"resistor\",value=\"1k\",between=[\"top\"]}]", "two"},
      {"extra=[{part=\"resistor\",value=\"1k\",between=[\"top\",5]}]", "node names"},
      {"extra=[{part=\"resistor\",value=\"1k\",between=\"top\"}]", "node names"},
      {"extra=[{part=\"resistor\",value=\"1k\",in_place_of=\"top-grid\"}]", "\"source-top\""},
      {"extra=[{part=\"resistor\",value=\"1k\",between=[\"top\",\"wipr\"]}]", "\"wiper\" meant?"},
      {"extra=[{part=\"resistor\",value=\"1k\",dial=5,between=[\"top\",\"ground\"]}]", "only a pot"},
      {"extra=[{part=\"pot\",value=\"1k\",taper=\"linear\",between=[\"top\",\"ground\"]}]", "three"},
      {"listening={treble_band=5}", "two frequencies"},
      {"listening={treble_band=[5000,2000]}", "lower to a higher"},
      {"listening={treble_band=[\"5k\",\"2 H\"]}", "an inductance"},
      {"listening={middle_band=[1,2]}", "\"body_band\""},
      {"second={}", "[second.source]"},
      {"blend={}", "\"MN\", \"linear\""},
      {"then=[{}]", "the stage holds nothing"},
      {"selector={use=\"first\"}", "nothing to select"}};
  for (const Row& row : rows) {
    CAPTURE(row.setting);
    const std::string message = refusal(kPickup, {row.setting});
    CHECK_THAT(message, ContainsSubstring(row.part_of_message));
    CHECK_THAT(message, ContainsSubstring("--set ") || ContainsSubstring("bench.hookup.toml"));
  }
}

TEST_CASE("Settings act on the file before the check, and are named in messages") {
  const Hookup hookup = parse(
      kPickup, {"tone.dial=4", "cable.length=10 m", "volume.taper=linear", "load.resistance=\"220k\"", "title=x = y"});
  CHECK(hookup.tone->dial == 4);
  CHECK_THAT(hookup.cable->capacitance_f, WithinRel(1000e-12, 1e-15));
  CHECK(hookup.volume.pot.taper.name() == "linear");
  CHECK(hookup.load.resistance_ohm == 220e3);
  CHECK(hookup.title == "x = y");
  CHECK(parse(kPickup, {"tone.dial=4", "tone.dial=5"}).tone->dial == 5);

  CHECK(parse(kLine, {"treble_bleed.capacitor=1n"}).treble_bleed->capacitor_f == 1e-9);
  const std::string extra = "[[extra]]\npart = \"resistor\"\nvalue = \"100k\"\nbetween = [\"wiper\", \"ground\"]\n";
  CHECK(parse(kLine + extra, {"extra.0.value=22k"}).extra[0].value == 22e3);
  CHECK(parse(kLine + extra, {"extra.0.between.1=top"}).extra[0].between[1] == "top");
  CHECK(
      parse(kLine, {"extra.0.part=inductor", "extra.0.value=1 mH", "extra.0.in_place_of=top-source"}).extra[0].value ==
      1e-3);

  CHECK_THAT(refusal(kPickup, {"tone.dial=44"}), ContainsSubstring("--set tone.dial=44: key \"tone.dial\": 44"));
  CHECK_THAT(refusal(kPickup, {"volume.resistance=5 F"}),
             ContainsSubstring("--set volume.resistance=5 F: key \"volume.resistance\""));
  CHECK_THAT(refusal(kPickup, {"tone.dail=4"}),
             ContainsSubstring("--set tone.dail=4") && ContainsSubstring("was \"dial\" meant?"));
  CHECK_THAT(refusal(kLine, {"tone.dial=4"}),
             ContainsSubstring("--set tone.dial=4: key \"tone.resistance\" is missing"));
  CHECK_THAT(refusal(kLine + extra, {"extra.2.value=22k"}), ContainsSubstring("counted from 0"));
  CHECK_THAT(refusal(kLine + extra, {"extra.x.value=22k"}), ContainsSubstring("counted from 0"));
  CHECK_THAT(refusal(kLine, {"volume.resistance.x=1"}), ContainsSubstring("not a table"));
  for (const std::string bad : {"", "=", "tone", "=5", ".dial=4", "tone..dial=4", "tone dial=4", "tone.=4",
                                "a.b.c.d.e.f.g.h.i=1", "tone.di\"al=4", "volume.resistance=\xFF\xFE"}) {
    CAPTURE(bad);
    CHECK_THAT(refusal(kPickup, {bad}), ContainsSubstring("--set"));
  }
  // A value cannot smuggle in a second key.
  CHECK_THAT(refusal(kLine, {"title=\"a\"\n[tone]\ndial = 3"}), ContainsSubstring("control character"));
}

TEST_CASE("What is not TOML is refused with its line") {
  CHECK_THAT(refusal("[source\nkind = 5"), ContainsSubstring("bench.hookup.toml:1: not valid TOML"));
  CHECK_THAT(refusal(kLine + "taper = linear\n"), ContainsSubstring("bench.hookup.toml:9: not valid TOML"));
  CHECK_THAT(refusal(kLine + "[volume]\n"), ContainsSubstring("bench.hookup.toml:9: not valid TOML"));
  CHECK_THAT(refusal("title = \"\xFF\xFE\"\n" + kLine), ContainsSubstring("bench.hookup.toml:1: not valid TOML"));
  CHECK_THAT(refusal(std::string("title = \"a\0b\"\n", 14) + kLine), ContainsSubstring("not valid TOML"));
  CHECK(parse("\xEF\xBB\xBF" + kLine).load.resistance_ohm == 47e3);  // byte order mark
  CHECK(parse(replaced(kLine, "\n", "\r\n")).load.resistance_ohm == 47e3);
}

TEST_CASE("Deep nesting is refused before it can hurt") {
  const std::size_t many = 300000;
  std::string tables;
  std::string dotted = "a";
  for (std::size_t i = 0; i < many; ++i) {
    tables += "{a=";
    dotted += ".a";
  }
  CHECK_THAT(refusal("x = " + std::string(many, '[')), ContainsSubstring("bench.hookup.toml:1: not valid TOML"));
  CHECK_THAT(refusal("x = " + tables), ContainsSubstring("bench.hookup.toml:1: not valid TOML"));
  CHECK_THAT(refusal("[" + dotted + "]"), ContainsSubstring("32 dots"));
  CHECK_THAT(refusal("title = \"x\"\n" + dotted + " = 1"), ContainsSubstring("bench.hookup.toml:2: more than 32 dots"));
  CHECK_THAT(refusal(kLine, {"load={" + dotted + "=1}"}), ContainsSubstring("32 dots"));
  CHECK_THAT(refusal(kLine, {"load=" + std::string(many, '[')}), ContainsSubstring("load"));

  // The deepest table that gets past both bounds is taken down in peace.
  std::string deepest;
  for (int i = 0; i < 250; ++i) {
    deepest += "{" + dotted.substr(0, 65) + "=";
  }
  CHECK_THAT(refusal("x = " + deepest + "1" + std::string(250, '}')), ContainsSubstring("key \"x\""));

  CHECK(parse("title = \"and so on .......................................................\"\n" + kLine).title.size() >
        50);
  CHECK(parse("title = \"((( [[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[[\"\n" + kLine).title.size() > 30);
}

TEST_CASE("Files that cannot be a hookup are refused by name") {
  const Folder folder;
  const fs::path good = folder.write("good.hookup.toml", kLine);
  CHECK(unsoldered::read_hookup(good).load.resistance_ohm == 47e3);
  CHECK(unsoldered::read_hookup(good, {"load.resistance=22k"}).load.resistance_ohm == 22e3);
  CHECK_THROWS_WITH(unsoldered::read_hookup(folder.path()), ContainsSubstring("is a folder"));
  CHECK_THROWS_WITH(unsoldered::read_hookup(folder.path() / "none.toml"), ContainsSubstring("no such file"));
  CHECK_THROWS_WITH(unsoldered::read_hookup(good / "below.toml"), ContainsSubstring("good.hookup.toml"));
  CHECK_THROWS_WITH(unsoldered::read_hookup("/dev/null"), ContainsSubstring("not a regular file"));
  CHECK_THROWS_WITH(unsoldered::read_hookup(""), ContainsSubstring("no such file"));
  const fs::path big = folder.write("big.hookup.toml", kLine);
  fs::resize_file(big, std::uintmax_t{1} << 30);  // sparse, so the disk keeps its room
  CHECK_THROWS_WITH(unsoldered::read_hookup(big), ContainsSubstring("larger than 1 MiB"));
}

TEST_CASE("A measured taper comes from a CSV beside the hookup and nowhere else") {
  const Folder folder;
  folder.write("outside.csv", "0,0\n1,1\n");
  folder.write("job/curve.csv", "travel,share\n0,0\n0.5,0.1\n1,1\n");
  folder.write("job/sub/curve.csv", "0,0\n1,1\n");
  const auto with_taper = [&](const std::string& csv) {
    return unsoldered::read_hookup(
        folder.write("job/x.hookup.toml", replaced(kLine, "\"linear\"", "{ measured = \"" + csv + "\" }")));
  };
  const Hookup hookup = with_taper("curve.csv");
  CHECK_THAT(hookup.volume.pot.taper.share(0.3), WithinAbs(0.03888, 1e-11));  // scipy 1.10.1 PchipInterpolator
  CHECK(hookup.volume.pot.taper.name() == "{ measured = \"curve.csv\" }");
  CHECK_NOTHROW(with_taper("sub/curve.csv"));
  CHECK_NOTHROW(with_taper("./sub/../curve.csv"));
  fs::create_symlink(folder.path() / "outside.csv", folder.path() / "job/link.csv");
  for (const std::string& out :
       {std::string("../outside.csv"), std::string("sub/../../outside.csv"), std::string("link.csv"),
        (folder.path() / "job/curve.csv").string(), std::string("/etc/hostname")}) {
    CAPTURE(out);
    CHECK_THROWS_WITH(with_taper(out),
                      ContainsSubstring("leads out of the folder") && ContainsSubstring("volume.taper.measured"));
  }
  CHECK_THROWS_WITH(with_taper("none.csv"), ContainsSubstring("no such file") && ContainsSubstring("x.hookup.toml:6"));
  CHECK_THROWS_WITH(with_taper(""), ContainsSubstring("no file is named"));
  CHECK_THROWS_WITH(with_taper("sub"), ContainsSubstring("is a folder"));
}

TEST_CASE("A measured taper may be shares or ohmmeter readings") {
  const auto share = [](const std::string& csv, double x) {
    return unsoldered::parse_measured_taper(csv, "m.csv").share(x);
  };
  CHECK_THAT(share("0,0\n0.5,0.1\n1,1\n", 0.5), WithinAbs(0.1, 1e-15));
  CHECK_THAT(share("# bench\r\n\r\ntravel, ohm\r\n0,20\r\n0.5,58k\r\n1,463k\r\n", 0.5),
             WithinAbs(57980.0 / 462980, 1e-12));
  CHECK_THAT(share("\xEF\xBB\xBF"
                   "0,0\n1,1",
                   0.25),
             WithinAbs(0.25, 1e-15));
  const auto refused = [](const std::string& csv, const std::string& part) {
    CHECK_THROWS_WITH(unsoldered::parse_measured_taper(csv, "m.csv"),
                      ContainsSubstring("m.csv") && ContainsSubstring(part));
  };
  refused("", "0 points");
  refused("travel,share\n", "0 points");
  refused("0,0\n", "1 points");
  refused("0,0\n0.5\n1,1\n", "m.csv:2");
  refused("0,0\n0,5,0,2\n1,1\n", "decimal sign is a point");
  refused("0;0\n1;1\n", "separator");
  refused("0,0\nx,y\n1,1\n", "m.csv:2");
  refused("a,b\nc,d\n0,0\n1,1\n", "m.csv:2");
  refused("0,0\n0.5,0.6\n0.7,0.5\n1,1\n", "share falls");
  refused("0,0\n0.5,0.6\n1,0.9\n", "last corner");
  refused("0,0\n0.5,nan\n1,1\n", "m.csv:2");
  refused("0,500k\n1,100k\n", "not above the first");
  refused(std::string("0,0\n\0,1\n", 8), "m.csv:2");
}

TEST_CASE("Every demo hookup reads") {
  int count = 0;
  for (const fs::directory_entry& entry : fs::directory_iterator(fs::path(UNSOLDERED_SOURCE_DIR) / "assets/demo")) {
    const std::string name = entry.path().filename().string();
    if (name.size() > 12 && name.substr(name.size() - 12) == ".hookup.toml") {
      CAPTURE(name);
      CHECK_FALSE(unsoldered::read_hookup(entry.path()).title.empty());
      ++count;
    }
  }
  CHECK(count >= 6);
}

TEST_CASE("A hookup file with bytes changed at random reads or is refused") {
  std::mt19937 random(11);
  int refused = 0;
  for (int i = 0; i < 3000; ++i) {
    std::string text = kPickup;
    const int changes = 1 + static_cast<int>(random() % 4);
    for (int n = 0; n < changes; ++n) {
      const std::size_t at = random() % text.size();
      switch (random() % 3) {
        case 0:
          text[at] = static_cast<char>(random() % 256);
          break;
        case 1:
          text.erase(at, 1 + random() % 8);
          break;
        default:
          text.insert(at, text.substr(random() % text.size(), random() % 12));
          break;
      }
    }
    try {
      parse(text);
    } catch (const InputError& error) {
      ++refused;
      REQUIRE_THAT(std::string(error.what()), ContainsSubstring("bench.hookup.toml"));
    }
  }
  CHECK(refused > 1000);
}
