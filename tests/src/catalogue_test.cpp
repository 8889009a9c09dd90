// The catalogue of generic parts, and hookup files that name its entries.
#include "src/catalogue.h"

#include <set>
#include <string>
#include <vector>

#include "dsp/error.h"
#include "dsp/knob_table.h"
#include "src/hookup_file.h"
#include "tests/catch.h"

using Catch::Matchers::ContainsSubstring;
using Catch::Matchers::WithinRel;
using unsoldered::catalogue;
using unsoldered::CatalogueEntry;
using unsoldered::Hookup;
using unsoldered::InputError;
using unsoldered::parse_hookup;

namespace {

const std::string kFromCatalogue = R"(source = "single coil"
volume = "500k audio"
treble_bleed = "1 nF with 150k across"
tone = "500k audio, 22 nF"
cable = "instrument cable, 5 m"
load = "valve amplifier input"
)";

/// A line source, so that any volume pot, tone control and load fits; `line` stands in the place of its block.
std::string hookup_with(const std::string& kind, const std::string& line) {
  std::string text = line + "\n";
  if (kind != "source") text += "source = { kind = \"line\", resistance = \"100\" }\n";
  if (kind != "volume") text += "volume = { resistance = \"10k\", taper = \"linear\" }\n";
  if (kind != "load") text += "load = { resistance = \"47k\" }\n";
  return text;
}

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

}  // namespace

TEST_CASE("Every entry of the catalogue can stand for its block") {
  REQUIRE(catalogue().size() >= 50);
  for (const CatalogueEntry& entry : catalogue()) {
    INFO(entry.kind << ": " << entry.name);
    const std::string line = entry.kind == "buffer" ? "then = [{ buffer = \"" + entry.name + "\" }]"
                                                    : entry.kind + " = \"" + entry.name + "\"";
    CHECK(refusal(hookup_with(entry.kind, line)) == "accepted");
  }
}

TEST_CASE("Entries have names of their own and say where their values come from") {
  std::set<std::string> names;
  for (const CatalogueEntry& entry : catalogue()) {
    INFO(entry.kind << ": " << entry.name);
    CHECK(names.insert(entry.kind + ": " + entry.name).second);
    CHECK_FALSE(entry.source.empty());
    CHECK_THAT(entry.values, ContainsSubstring(" = "));
  }
}

TEST_CASE("Pickups of the catalogue carry the loss of their core") {
  int pickups = 0;
  for (const CatalogueEntry& entry : catalogue()) {
    if (entry.kind != "source" || entry.values.find("pickup") == std::string::npos) continue;
    ++pickups;
    const Hookup hookup = parse(hookup_with("source", "source = \"" + entry.name + "\""));
    INFO(entry.name);
    REQUIRE(hookup.source.loss_ohm.has_value());
    CHECK(*hookup.source.loss_ohm >= 100e3);  // 100k to 1M, common practice (and from memory for humbuckers)
    CHECK(*hookup.source.loss_ohm <= 1e6);
  }
  CHECK(pickups >= 6);
}

TEST_CASE("Loaded as usual, pickups of the catalogue peak where the trade expects it") {
  struct Case {
    std::string source;
    std::string pots;
    std::string tone;
    double low_hz;  // common practice, total cable capacitance 500 to 700 pF
    double high_hz;
  };
  const std::vector<Case> cases = {{"single coil", "250k audio", "250k audio, 47 nF", 3000, 4500},
                                   {"humbucker", "500k audio", "500k audio, 22 nF", 2000, 3200}};
  for (const Case& one : cases) {
    const Hookup hookup = parse("source = \"" + one.source + "\"\nvolume = \"" + one.pots + "\"\ntone = \"" + one.tone +
                                "\"\ncable = \"instrument cable, 5 m\"\nload = \"valve amplifier input\"\n");
    const std::vector<unsoldered::KnobRow> rows = unsoldered::knob_table(hookup, {10});
    INFO(one.source);
    REQUIRE(rows.front().peak_hz.has_value());
    CHECK(*rows.front().peak_hz > one.low_hz);
    CHECK(*rows.front().peak_hz < one.high_hz);
  }
}

TEST_CASE("A hookup of catalogue names is the hookup written out") {
  const Hookup hookup = parse(kFromCatalogue);
  CHECK_THAT(hookup.source.inductance_h, WithinRel(2.5, 1e-12));
  CHECK_THAT(hookup.volume.pot.total_ohm, WithinRel(500e3, 1e-12));
  CHECK(hookup.volume.pot.dead_cw_deg == 15);
  REQUIRE(hookup.treble_bleed.has_value());
  CHECK_THAT(hookup.treble_bleed->parallel_ohm.value_or(0), WithinRel(150e3, 1e-12));
  REQUIRE(hookup.tone.has_value());
  CHECK_THAT(hookup.tone->capacitor_f, WithinRel(22e-9, 1e-12));
  REQUIRE(hookup.cable.has_value());
  CHECK_THAT(hookup.cable->capacitance_f, WithinRel(500e-12, 1e-12));
  CHECK_THAT(hookup.load.capacitance_f, WithinRel(120e-12, 1e-12));
}

TEST_CASE("A value beside the catalogue name takes the place of the entry's") {
  const Hookup hookup = parse(R"(source = { catalogue = "humbucker", resistance = "7k4" }
cable = { catalogue = "instrument cable, 5 m", length = "7 m" }
[volume]
catalogue = "500k audio"
taper = "linear"
[load]
catalogue = "valve amplifier input"
)");
  CHECK_THAT(hookup.source.resistance_ohm, WithinRel(7400, 1e-12));
  CHECK_THAT(hookup.source.inductance_h, WithinRel(4.5, 1e-12));
  CHECK_THAT(hookup.volume.pot.taper.share(0.5), WithinRel(0.5, 1e-12));
  CHECK_THAT(hookup.volume.pot.total_ohm, WithinRel(500e3, 1e-12));
  CHECK_THAT(hookup.cable->capacitance_f, WithinRel(700e-12, 1e-12));
}

TEST_CASE("A value said in another way puts the entry's aside") {
  const std::string line = "cable = { catalogue = \"instrument cable, 5 m\", capacitance = \"680 pF\" }";
  CHECK_THAT(parse(hookup_with("cable", line)).cable->capacitance_f, WithinRel(680e-12, 1e-12));
  const std::string coiled =
      "cable = { catalogue = \"coiled cable\", length = \"2 m\", capacitance_per_metre = \"200 pF\" }";
  CHECK_THAT(parse(hookup_with("cable", coiled)).cable->capacitance_f, WithinRel(400e-12, 1e-12));
  const std::string bleed = "treble_bleed = { catalogue = \"1 nF with 150k across\", series_resistor = \"130k\" }";
  const Hookup hookup = parse(hookup_with("treble_bleed", bleed));
  CHECK_FALSE(hookup.treble_bleed->parallel_ohm.has_value());
  CHECK_THAT(hookup.treble_bleed->series_ohm.value_or(0), WithinRel(130e3, 1e-12));
}

TEST_CASE("Settings name entries and override their values, in order") {
  CHECK_THAT(parse(kFromCatalogue, {"load=line input"}).load.resistance_ohm, WithinRel(47e3, 1e-12));
  CHECK_THAT(parse(kFromCatalogue, {"load=\"line input\""}).load.resistance_ohm, WithinRel(47e3, 1e-12));
  CHECK_THAT(parse(kFromCatalogue, {"cable.length=10 m"}).cable->capacitance_f, WithinRel(1e-9, 1e-12));
  CHECK_THAT(parse(kFromCatalogue, {"cable=low-capacitance cable, 5 m", "cable.length=10 m"}).cable->capacitance_f,
             WithinRel(500e-12, 1e-12));
  CHECK_THAT(parse(kFromCatalogue, {"cable.length=10 m", "cable=instrument cable, 3 m"}).cable->capacitance_f,
             WithinRel(300e-12, 1e-12));
  CHECK_THAT(parse(kFromCatalogue, {"cable.catalogue=low-capacitance cable, 5 m"}).cable->capacitance_f,
             WithinRel(250e-12, 1e-12));
  CHECK(parse(kFromCatalogue, {"tone.dial=4"}).tone->dial == 4);
  // A block written out, then replaced by a name.
  CHECK_THAT(
      parse(hookup_with("load", "load = { resistance = \"1M\" }"), {"load=microphone input"}).load.resistance_ohm,
      WithinRel(1500, 1e-12));
}

TEST_CASE("Names are looked up in the second source and in further stages too") {
  const Hookup hookup = parse(kFromCatalogue + R"([second]
source = "humbucker"
volume = { catalogue = "250k linear", dial = 8 }
[[then]]
volume = "volume pedal, 250k"
cable = "instrument cable, 3 m"
[[then]]
buffer = { catalogue = "effect buffer", gain_db = 6 }
)");
  REQUIRE(hookup.second.has_value());
  CHECK_THAT(hookup.second->source.inductance_h, WithinRel(4.5, 1e-12));
  REQUIRE(hookup.second->volume.has_value());
  CHECK_THAT(hookup.second->volume->pot.total_ohm, WithinRel(250e3, 1e-12));
  CHECK(hookup.second->volume->dial == 8);
  REQUIRE(hookup.then.size() == 2);
  REQUIRE(hookup.then[0].volume.has_value());
  CHECK_THAT(hookup.then[0].volume->pot.total_ohm, WithinRel(250e3, 1e-12));
  CHECK_THAT(hookup.then[0].cable->capacitance_f, WithinRel(300e-12, 1e-12));
  REQUIRE(hookup.then[1].buffer.has_value());
  CHECK(hookup.then[1].buffer->gain_db == 6);
}

TEST_CASE("A name that is not in the catalogue is refused with file, line, the nearest name and how to list them") {
  struct Case {
    std::string line;
    std::vector<std::string> words;
  };
  const std::vector<Case> cases = {
      {"load = \"valve amplifer input\"",
       {"bench.hookup.toml:1", "valve amplifer input", "\"valve amplifier input\" meant"}},
      {"load = \"valve amp\"", {"\"valve amplifier input\" meant", "unsoldered catalogue load", "[load]"}},
      {"volume = \"500k\"", {"bench.hookup.toml:1", "\"500k audio\" meant", "unsoldered catalogue volume"}},
      {"cable = \"xyz\"", {"\"xyz\" is not in the catalogue", "unsoldered catalogue cable lists the cables"}},
      {"source = { catalogue = \"single coils\" }", {"bench.hookup.toml:1", "\"single coil\" meant"}},
      {"load = { catalogue = 3 }", {"bench.hookup.toml:1", "load.catalogue", "double quotes"}},
      {"then = [{ cable = \"instrument cable, 5m\" }]", {"then.0.cable", "\"instrument cable, 5 m\" meant"}},
  };
  for (const Case& one : cases) {
    const std::string kind = one.line.substr(0, one.line.find(' '));
    const std::string message = refusal(hookup_with(kind, one.line));
    for (const std::string& word : one.words) CHECK_THAT(message, ContainsSubstring(word));
  }
  CHECK_THAT(refusal(kFromCatalogue, {"load=lin input"}), ContainsSubstring("--set load=lin input"));
}

TEST_CASE("What does not fit an entry is refused where it stands") {
  CHECK_THAT(refusal(hookup_with("load", "\nload = { catalogue = \"line input\", ressistance = \"1M\" }")),
             ContainsSubstring("bench.hookup.toml:2") && ContainsSubstring("ressistance"));
  CHECK_THAT(refusal(hookup_with("source", "source = { catalogue = \"humbucker\", kind = \"line\" }")),
             ContainsSubstring("source.kind") && ContainsSubstring("\"pickup\""));
  // A coiled cable is given as a whole, so a length alone is not enough; the line is that of the block.
  CHECK_THAT(refusal(hookup_with("cable", "\ncable = { catalogue = \"coiled cable\", length = \"2 m\" }")),
             ContainsSubstring("bench.hookup.toml:2") && ContainsSubstring("capacitance_per_metre"));
}
