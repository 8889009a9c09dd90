#include "src/hookup_file.h"

#include <algorithm>
#include <optional>
#include <string_view>
#include <utility>

#include "dsp/error.h"
#include "dsp/quantity.h"
#include "src/hookup_pot.h"
#include "src/toml_block.h"
#include "src/toml_document.h"

namespace unsoldered {
namespace {

// Wide enough for any real part and for textbook cases; what lies outside is a slip of a prefix.
constexpr Range kResistance{0, 1e9};
constexpr Range kShunt{1, 100e9};  // loss and leak resistances
constexpr Range kLoad{1, 10e9};
constexpr Range kCapacitor{0.01e-12, 10e-3};
constexpr Range kStray{0, 10e-3};  // capacitances that may be left at nothing
constexpr Range kInductance{1e-9, 10e3};
constexpr Range kLength{0, 1000};
constexpr Range kFrequency{0.1, 1e6};
constexpr NumberRange kDial{0, 10, ""};
constexpr std::string_view kLater = "this version does not compute it; take it out";
constexpr double kMetresPerFoot = 0.3048;

std::vector<std::string_view> with(std::vector<std::string_view> keys, const std::vector<std::string_view>& more) {
  keys.insert(keys.end(), more.begin(), more.end());
  return keys;
}

/// A resistance that may be written as "none".
std::optional<double> shunt_or_none(const TomlBlock& block, std::string_view key) {
  const toml::node* value = block.find(key);
  if (value != nullptr && value->is_string() && value->as_string()->get() == "none") {
    return std::nullopt;
  }
  return block.optional_quantity(key, Unit::ohm, kShunt);
}

Source read_source(const TomlBlock& block) {
  const std::vector<std::string_view> every_kind = {
      "kind", "inductance", "resistance", "capacitance", "loss_resistance", "leak_resistance", "tolerance"};
  block.allow_only(every_kind);
  Source source;
  switch (block.choice("kind", {"pickup", "line", "piezo"})) {
    case 0: {
      block.allow_only({"kind", "inductance", "resistance", "capacitance", "loss_resistance", "tolerance"}, every_kind,
                       "not used by a pickup");
      source.kind = SourceKind::pickup;
      source.inductance_h = block.quantity("inductance", Unit::henry, kInductance);
      source.resistance_ohm = block.quantity("resistance", Unit::ohm, kResistance);
      source.capacitance_f = block.quantity("capacitance", Unit::farad, kStray);
      if (!block.has("loss_resistance")) {
        block.refuse_missing(
            "loss_resistance",
            "the eddy-current loss of a pickup as a resistance across it, from 1 ohm to 100G (100k to 1M are "
            "common), or \"none\" written out");
      }
      source.loss_ohm = shunt_or_none(block, "loss_resistance");
      break;
    }
    case 1:
      block.allow_only({"kind", "resistance", "capacitance", "tolerance"}, every_kind, "not used by a line source");
      source.kind = SourceKind::line;
      source.resistance_ohm = block.quantity("resistance", Unit::ohm, kResistance);
      source.capacitance_f = block.optional_quantity("capacitance", Unit::farad, kCapacitor);
      break;
    default:
      block.allow_only({"kind", "capacitance", "leak_resistance", "tolerance"}, every_kind, "not used by a piezo");
      source.kind = SourceKind::piezo;
      source.capacitance_f = block.quantity("capacitance", Unit::farad, kCapacitor);
      source.leak_ohm = shunt_or_none(block, "leak_resistance");
      break;
  }
  source.tolerance = block.tolerance();
  return source;
}

Volume read_volume(const TomlBlock& block, const std::filesystem::path& folder) {
  block.allow_only(with({"resistance", "source_on"}, pot_keys()), {"right"}, kLater);
  Volume volume;
  volume.pot = read_pot(block, "resistance", folder);
  volume.source_on =
      block.optional_choice("source_on", {"top", "wiper"}).value_or(0) == 0 ? SourceOn::top : SourceOn::wiper;
  return volume;
}

TrebleBleed read_treble_bleed(const TomlBlock& block) {
  block.allow_only({"capacitor", "parallel_resistor", "series_resistor", "tolerance"});
  TrebleBleed bleed;
  bleed.capacitor_f = block.quantity("capacitor", Unit::farad, kCapacitor);
  bleed.parallel_ohm = block.optional_quantity("parallel_resistor", Unit::ohm, kResistance);
  bleed.series_ohm = block.optional_quantity("series_resistor", Unit::ohm, kResistance);
  bleed.tolerance = block.tolerance();
  return bleed;
}

Tone read_tone(const TomlBlock& block, const std::filesystem::path& folder) {
  block.allow_only(with({"resistance", "capacitor", "position", "dial", "no_load"}, pot_keys()));
  Tone tone;
  tone.pot = read_pot(block, "resistance", folder);
  tone.capacitor_f = block.quantity("capacitor", Unit::farad, kCapacitor);
  tone.position = block.optional_choice("position", {"source", "output"}).value_or(0) == 0 ? TonePosition::source
                                                                                           : TonePosition::output;
  tone.dial = block.optional_number("dial", kDial).value_or(10);
  tone.no_load = block.optional_flag("no_load").value_or(false);
  return tone;
}

/// "100 pF", "100 pF/m" or, as in some catalogues, "30 pF/ft"; in farad per metre.
std::optional<double> read_per_metre(const TomlBlock& block) {
  constexpr std::string_view key = "capacitance_per_metre";
  const std::optional<std::string> text =
      block.has(key) && block.find(key)->is_string() ? block.optional_text(key) : std::nullopt;
  const auto ends_with = [&](std::string_view end) {
    return text && text->size() > end.size() && text->compare(text->size() - end.size(), end.size(), end) == 0;
  };
  if (!ends_with("/m") && !ends_with("/ft")) {
    return block.optional_quantity(key, Unit::farad, kStray);
  }
  const std::string value = text->substr(0, text->rfind('/'));
  try {
    return parse_quantity(value, Unit::farad, kStray) / (ends_with("/ft") ? kMetresPerFoot : 1.0);
  } catch (const InputError& error) {
    block.refuse(key, error.what());
  }
}

Cable read_cable(const TomlBlock& block) {
  block.allow_only({"length", "capacitance_per_metre", "capacitance", "tolerance"});
  Cable cable;
  const std::optional<double> total_f = block.optional_quantity("capacitance", Unit::farad, kStray);
  const std::optional<double> length_m = block.optional_quantity("length", Unit::metre, kLength);
  const std::optional<double> per_metre_f = read_per_metre(block);
  if (total_f && (length_m || per_metre_f)) {
    block.refuse("capacitance",
                 "the capacitance of the whole cable is given, and a length or a capacitance per metre as "
                 "well; keep one of the two ways");
  }
  if (total_f) {
    cable.capacitance_f = *total_f;
  } else if (!length_m) {
    block.refuse_missing("length",
                         "a length from 0 m to 1000 m with capacitance_per_metre, or capacitance = \"680 pF\" as read "
                         "on a meter");
  } else if (!per_metre_f) {
    block.refuse_missing("capacitance_per_metre", "it goes with length; \"100 pF\" is common for instrument cable");
  } else {
    cable.capacitance_f = *length_m * *per_metre_f;
  }
  cable.tolerance = block.tolerance();
  return cable;
}

Load read_load(const TomlBlock& block) {
  block.allow_only({"resistance", "capacitance", "coupling", "tolerance"});
  Load load;
  load.resistance_ohm = block.quantity("resistance", Unit::ohm, kLoad);
  load.capacitance_f = block.optional_quantity("capacitance", Unit::farad, kStray).value_or(0);
  load.coupling_f = block.optional_quantity("coupling", Unit::farad, kCapacitor);
  load.tolerance = block.tolerance();
  return load;
}

std::vector<std::string> read_nodes(const TomlBlock& block) {
  constexpr std::string_view wanted = "a list of node names, as in between = [\"wiper\", \"ground\"]";
  const toml::node* value = block.find("between");
  if (value == nullptr) {
    block.refuse_missing("between", std::string(wanted) + ", or in_place_of with the wire the part stands in for");
  }
  const toml::array* list = value->as_array();
  if (list == nullptr) {
    block.refuse_type("between", *value, wanted);
  }
  std::vector<std::string> nodes;
  for (const toml::node& entry : *list) {
    const auto* name = entry.as_string();
    if (name == nullptr) {
      block.refuse_type("between", entry, wanted);
    }
    nodes.push_back(name->get());
  }
  return nodes;
}

/// The wire is written in its usual order, and a part without nodes of its own takes the wire's.
void read_place(const TomlBlock& block, const Hookup& hookup, ExtraPart& part) {
  part.in_place_of = block.optional_text("in_place_of").value_or("");
  const std::optional<Wire> wire = find_wire(hookup, part.in_place_of);
  if (wire) {
    part.in_place_of = wire->name();
  }
  if (wire && part.kind != PartKind::pot && !block.has("between")) {
    part.between = {wire->from, wire->to};
  } else if (!part.in_place_of.empty() && !wire) {
    std::string names;
    for (const Wire& known : replaceable_wires(hookup)) {
      names += (names.empty() ? "" : ", ") + in_quotes(known.name());
    }
    block.refuse("in_place_of", in_quotes(part.in_place_of) + " is not a wire of this hookup; accepted are " + names);
  } else {
    part.between = read_nodes(block);
  }
}

ExtraPart read_extra(const TomlBlock& block, const Hookup& hookup, const std::filesystem::path& folder) {
  const std::vector<std::string_view> places = {"part", "value", "between", "in_place_of"};
  const std::vector<std::string_view> every_part = with(with(places, {"dial"}), pot_keys());
  block.allow_only(every_part);
  ExtraPart part;
  part.kind = static_cast<PartKind>(block.choice("part", {"resistor", "capacitor", "inductor", "pot"}));
  if (part.kind != PartKind::pot) {
    block.allow_only(with(places, {"tolerance"}), every_part, "only a pot has it");
  }
  switch (part.kind) {
    case PartKind::resistor:
      part.value = block.quantity("value", Unit::ohm, kResistance);
      break;
    case PartKind::capacitor:
      part.value = block.quantity("value", Unit::farad, kCapacitor);
      break;
    case PartKind::inductor:
      part.value = block.quantity("value", Unit::henry, kInductance);
      break;
    case PartKind::pot:
      part.pot = read_pot(block, "value", folder);
      part.value = part.pot.total_ohm;
      part.dial = block.optional_number("dial", kDial).value_or(10);
      break;
  }
  read_place(block, hookup, part);
  part.tolerance = block.tolerance();
  return part;
}

Band read_band(const TomlBlock& block, std::string_view key, Band usual) {
  const toml::node* value = block.find(key);
  if (value == nullptr) {
    return usual;
  }
  const toml::array* ends = value->as_array();
  if (ends == nullptr || ends->size() != 2) {
    block.refuse(key, "a band is a list of two frequencies, as in [2000, 5000]");
  }
  return {block.quantity_of(key, (*ends)[0], Unit::hertz, kFrequency),
          block.quantity_of(key, (*ends)[1], Unit::hertz, kFrequency)};
}

Listening read_listening(const TomlBlock& block, const Hookup& hookup) {
  block.allow_only({"treble_band", "body_band"});
  const Listening usual = listening_bands(hookup);
  return {read_band(block, "treble_band", usual.treble), read_band(block, "body_band", usual.body)};
}

Hookup read_blocks(const TomlDocument& document, const std::filesystem::path& folder) {
  const TomlBlock root(document);
  root.allow_only({"title", "source", "volume", "treble_bleed", "tone", "cable", "load", "extra", "listening"},
                  {"second", "selector", "blend", "then"}, kLater);
  Hookup hookup;
  hookup.title = root.optional_text("title").value_or("");
  hookup.source =
      read_source(root.block("source", "[source] with kind = \"pickup\", \"line\" or \"piezo\" and its values"));
  hookup.volume = read_volume(root.block("volume", "[volume] with resistance and taper"), folder);
  if (const std::optional<TomlBlock> block = root.optional_block("treble_bleed")) {
    hookup.treble_bleed = read_treble_bleed(*block);
  }
  if (const std::optional<TomlBlock> block = root.optional_block("tone")) {
    hookup.tone = read_tone(*block, folder);
  }
  if (const std::optional<TomlBlock> block = root.optional_block("cable")) {
    hookup.cable = read_cable(*block);
  }
  hookup.load = read_load(root.block("load", "[load] with the resistance of the input, as in resistance = \"1M\""));
  for (const TomlBlock& block : root.blocks("extra")) {
    hookup.extra.push_back(read_extra(block, hookup, folder));
  }
  if (const std::optional<TomlBlock> block = root.optional_block("listening")) {
    hookup.listening = read_listening(*block, hookup);
  }
  return hookup;
}

/// The files named by the keys "measured" of a table, wherever they stand in it.
void add_measured(const toml::node& node, const std::filesystem::path& folder,
                  std::vector<std::filesystem::path>& files) {
  if (const toml::array* list = node.as_array()) {
    for (const toml::node& entry : *list) add_measured(entry, folder, files);
  }
  const toml::table* table = node.as_table();
  if (table == nullptr) return;
  for (const auto& [key, value] : *table) {
    const auto* name = value.as_string();
    if (key == "measured" && name != nullptr) files.push_back(folder / name->get());
    add_measured(value, folder, files);
  }
}

TomlDocument parse_with_settings(const std::string& toml, const std::string& name,
                                 const std::vector<std::string>& settings) {
  TomlDocument document = parse_toml(toml, name);
  for (const std::string& setting : settings) apply_setting(document, setting);
  return document;
}

}  // namespace

Hookup parse_hookup(const std::string& toml, const std::string& name, const std::filesystem::path& folder,
                    const std::vector<std::string>& settings) {
  const TomlDocument document = parse_with_settings(toml, name, settings);
  Hookup hookup = read_blocks(document, folder);
  try {
    validate(hookup);
  } catch (const HookupError& error) {
    throw InputError(place_of(document, error.key()) + ": key " + in_quotes(error.key()) + ": " + error.what());
  }
  return hookup;
}

Hookup read_hookup(const std::filesystem::path& file, const std::vector<std::string>& settings) {
  return parse_hookup(read_small_file(file), file.string(), file.parent_path(), settings);
}

std::vector<std::filesystem::path> files_of_hookup(const std::filesystem::path& file,
                                                   const std::vector<std::string>& settings) {
  std::vector<std::filesystem::path> files = {file};
  add_measured(parse_with_settings(read_small_file(file), file.string(), settings).root, file.parent_path(), files);
  return files;
}

}  // namespace unsoldered
