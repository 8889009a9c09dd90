#include "src/hookup_file.h"

#include <cmath>
#include <optional>
#include <string_view>
#include <utility>

#include "dsp/error.h"
#include "dsp/quantity.h"
#include "src/catalogue.h"
#include "src/hookup_blocks.h"
#include "src/hookup_pot.h"
#include "src/number_text.h"
#include "src/toml_block.h"
#include "src/toml_document.h"

namespace unsoldered {
namespace {

constexpr Range kResistance{0, 1e9};  // of extra parts; as in hookup_blocks.cpp
constexpr Range kCapacitor{0.01e-12, 10e-3};
constexpr Range kInductance{1e-9, 10e3};
constexpr Range kFrequency{0.1, 1e6};
constexpr NumberRange kDial{0, 10, ""};
constexpr NumberRange kChannel{1, 8, ""};

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
  root.allow_only({"title", "source", "volume", "treble_bleed", "tone", "second", "second_channel", "selector", "blend",
                   "cable", "then", "load", "extra", "listening"});
  Hookup hookup;
  hookup.title = root.optional_text("title").value_or("");
  hookup.source =
      read_source(root.block("source", "[source] with kind = \"pickup\", \"line\" or \"piezo\" and its values"));
  hookup.volume = read_volume(root.block("volume", "[volume] with resistance and taper"), folder, false);
  if (const auto block = root.optional_block("treble_bleed")) hookup.treble_bleed = read_treble_bleed(*block);
  if (const auto block = root.optional_block("tone")) hookup.tone = read_tone(*block, folder);
  if (const auto block = root.optional_block("second")) hookup.second = read_second(*block, folder);
  if (const auto block = root.optional_block("selector")) hookup.selector = read_selector(*block);
  if (const auto block = root.optional_block("blend")) hookup.blend = read_blend(*block);
  if (const auto block = root.optional_block("cable")) hookup.cable = read_cable(*block);
  for (const TomlBlock& block : root.blocks("then")) hookup.then.push_back(read_stage(block, folder));
  hookup.load = read_load(root.block("load", "[load] with the resistance of the input, as in resistance = \"1M\""));
  if (const std::optional<double> channel = root.optional_number("second_channel", kChannel)) {
    if (*channel != std::floor(*channel))
      root.refuse("second_channel", format_number(*channel) + " is no channel number; accepted are 1 to 8");
    hookup.second_channel = static_cast<int>(*channel);
  }
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
  for (const std::string_view sound : {"RIFF", "RF64", "fLaC", "FORM", "OggS", "ID3", "riff"})
    if (toml.starts_with(sound))
      throw InputError(name + ": is a sound file; a hookup file is text, such as those in assets/demo");
  TomlDocument document = parse_toml(toml, name);
  if (document.root.contains("unsoldered_job"))
    throw InputError(name +
                     ": is a job file; render --job plays it, and its hookups have files of their own or stand in it");
  apply_settings_and_catalogue(document, settings);
  return document;
}

}  // namespace

Hookup hookup_from(const TomlDocument& document, const std::filesystem::path& folder) {
  Hookup hookup = read_blocks(document, folder);
  try {
    validate(hookup);
  } catch (const HookupError& error) {
    throw InputError(place_of(document, error.key()) + ": key " + in_quotes(error.key()) + ": " + error.what());
  }
  return hookup;
}

Hookup parse_hookup(const std::string& toml, const std::string& name, const std::filesystem::path& folder,
                    const std::vector<std::string>& settings) {
  return hookup_from(parse_with_settings(toml, name, settings), folder);
}

std::vector<std::filesystem::path> measured_files(const toml::table& hookup, const std::filesystem::path& folder) {
  std::vector<std::filesystem::path> files;
  add_measured(hookup, folder, files);
  return files;
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
