#include "src/catalogue.h"

#include <algorithm>
#include <cctype>
#include <sstream>
#include <tuple>
#include <utility>

#include "dsp/error.h"
#include "src/catalogue_text.h"
#include "src/toml_block.h"

namespace unsoldered {
namespace {

constexpr std::string_view kCatalogueKey = "catalogue";

/// `key = value`; text in single quotes where it can be, which a CSV need not double.
std::string inline_text(std::string_view key, const toml::node& value) {
  std::ostringstream text;
  text << key << " = ";
  value.visit([&](const auto& node) { text << toml::toml_formatter{node}; });
  return text.str();
}

/// `key = value, key = value` in the order they were written in.
std::string values_text(const toml::table& values) {
  struct Item {
    toml::source_position at;
    std::string text;
  };
  std::vector<Item> items;
  for (const auto& [key, value] : values) {
    items.push_back({key.source().begin, inline_text(key.str(), value)});
  }
  std::sort(items.begin(), items.end(), [](const Item& a, const Item& b) {
    return std::tie(a.at.line, a.at.column) < std::tie(b.at.line, b.at.column);
  });
  std::string out;
  for (const Item& item : items) out += (out.empty() ? "" : ", ") + item.text;
  return out;
}

std::vector<CatalogueEntry> read_catalogue() {
  const TomlDocument document = parse_toml(kCatalogueText, "catalogue");
  std::vector<CatalogueEntry> entries;
  const TomlBlock root(document);
  for (const TomlBlock& block : root.blocks("entry")) {
    block.allow_only({"kind", "name", "values", "source"});
    static_cast<void>(block.block("values", "the keys of the block"));
    entries.push_back({block.text("kind", "a block of a hookup file"), block.text("name", "a name"),
                       values_text(*block.find("values")->as_table()), block.text("source", "\"common practice\"")});
  }
  return entries;
}

std::vector<std::string> words_of(std::string_view text) {
  std::vector<std::string> words(1);
  for (const char c : text) {
    if (std::isalnum(static_cast<unsigned char>(c)) != 0 || c == '.') {
      words.back() += static_cast<char>(std::tolower(static_cast<unsigned char>(c)));
    } else if (!words.back().empty()) {
      words.emplace_back();
    }
  }
  if (words.back().empty()) words.pop_back();
  return words;
}

/// What a kind is called where a message lists several.
std::string plural(std::string_view kind) { return kind == "treble_bleed" ? "treble bleeds" : std::string(kind) + "s"; }

/// A table parsed from `toml`, every node of which answers `place` when asked where it was written.
toml::table table_at(const std::string& toml, const std::string& place) { return toml::parse(toml, place); }

/// Calls act(parent, kind, dotted) for every place where a block of the catalogue may stand.
template <typename Act>
void at_each_block(toml::table& root, const Act& act) {
  const auto in_stage = [&](toml::table& table, const std::string& path) {
    for (const std::string_view kind : catalogue_kinds()) act(table, kind, path + std::string(kind));
  };
  in_stage(root, "");
  if (toml::table* second = root["second"].as_table()) in_stage(*second, "second.");
  if (toml::array* stages = root["then"].as_array()) {
    for (std::size_t i = 0; i < stages->size(); ++i) {
      if (toml::table* stage = (*stages)[i].as_table()) in_stage(*stage, "then." + std::to_string(i) + ".");
    }
  }
}

/// `load = "line input"` becomes `load = { catalogue = "line input" }`, so that a setting may override its values.
void name_entries(TomlDocument& document) {
  at_each_block(document.root, [&](toml::table& parent, std::string_view kind, const std::string&) {
    const toml::node* value = parent.get(kind);
    if (value == nullptr || !value->is_string()) return;
    const std::string place = place_of(document, *value);
    toml::table table = table_at(inline_text(kCatalogueKey, *value), place);
    parent.insert_or_assign(kind, std::move(table));
  });
}

[[noreturn]] void refuse(const TomlDocument& document, const toml::node& at, const std::string& key,
                         const std::string& why) {
  throw InputError(place_of(document, at) + ": key " + in_quotes(key) + ": " + why);
}

const CatalogueEntry& entry_named(const TomlDocument& document, const toml::node& name, std::string_view kind,
                                  const std::string& dotted) {
  const auto* text = name.as_string();
  const std::string list = "unsoldered catalogue " + std::string(kind) + " lists the " + plural(kind);
  if (text == nullptr) {
    refuse(document, name, dotted + "." + std::string(kCatalogueKey), "wanted is a name in double quotes; " + list);
  }
  if (const CatalogueEntry* entry = find_in_catalogue(kind, text->get())) return *entry;
  const std::string_view near = nearest_in_catalogue(kind, text->get());
  refuse(document, name, dotted,
         in_quotes(text->get()) + " is not in the catalogue" +
             (near.empty() ? "" : "; was " + in_quotes(near) + " meant?") + (near.empty() ? "; " : " ") + list +
             ", or write the block itself, starting with [" + dotted + "]");
}

/// Whether a key of the entry gives way to what the block says in another way.
bool gives_way(std::string_view kind, std::string_view key, const toml::table& block) {
  if (block.contains(key)) return true;
  if (kind == "treble_bleed") {
    return (key == "parallel_resistor" && block.contains("series_resistor")) ||
           (key == "series_resistor" && block.contains("parallel_resistor"));
  }
  if (kind != "cable") return false;
  return key == "capacitance" ? block.contains("length") || block.contains("capacitance_per_metre")
                              : (key == "length" || key == "capacitance_per_metre") && block.contains("capacitance");
}

void fill_in(const TomlDocument& document, toml::table& block, std::string_view kind, const std::string& dotted) {
  const toml::node& name = *block.get(kCatalogueKey);
  const CatalogueEntry& entry = entry_named(document, name, kind, dotted);
  // One line for each block is enough: all that the entry brings was written where its name was.
  toml::table values = table_at("values = { " + entry.values + " }", place_of(document, name));
  const toml::table said = block;  // what the user wrote, before the entry's keys join it
  for (auto&& [key, value] : *values["values"].as_table()) {
    const std::string_view key_text = key.str();
    const std::string_view entry_kind = value.value_or(std::string_view());
    if (key_text == "kind" && said.contains("kind") && said["kind"].value_or(std::string_view()) != entry_kind) {
      refuse(document, *block.get("kind"), dotted + ".kind",
             "differs from the kind of " + in_quotes(entry.name) + ", " + in_quotes(entry_kind) +
                 "; take it out, or name an entry of that kind (unsoldered catalogue source lists them)");
    }
    if (gives_way(kind, key_text, said)) continue;
    value.visit([&](auto& node) { block.insert_or_assign(key_text, std::move(node)); });
  }
  block.erase(kCatalogueKey);
}

}  // namespace

const std::vector<CatalogueEntry>& catalogue() {
  static const std::vector<CatalogueEntry> entries = read_catalogue();
  return entries;
}

std::vector<std::string_view> catalogue_kinds() {
  std::vector<std::string_view> kinds;
  for (const CatalogueEntry& entry : catalogue()) {
    if (std::find(kinds.begin(), kinds.end(), entry.kind) == kinds.end()) kinds.push_back(entry.kind);
  }
  return kinds;
}

const CatalogueEntry* find_in_catalogue(std::string_view kind, std::string_view name) {
  for (const CatalogueEntry& entry : catalogue()) {
    if (entry.kind == kind && entry.name == name) return &entry;
  }
  return nullptr;
}

std::string_view nearest_in_catalogue(std::string_view kind, std::string_view name) {
  std::vector<std::string_view> names;
  for (const CatalogueEntry& entry : catalogue()) {
    if (entry.kind == kind) names.push_back(entry.name);
  }
  if (const std::string_view near = nearest(name, names); !near.empty()) return near;
  // "valve amp" is no slip of "valve amplifier input", but shares its words.
  const std::vector<std::string> words = words_of(name.substr(0, 256));
  std::string_view best;
  std::size_t most = 0;
  for (const std::string_view candidate : names) {
    std::size_t shared = 0;
    for (const std::string& word : words_of(candidate)) {
      if (std::find(words.begin(), words.end(), word) != words.end()) ++shared;
    }
    if (shared > most) {
      best = candidate;
      most = shared;
    }
  }
  return best;
}

namespace {

/// `tone=none`, `second.tone=none`: the block goes, so that a call can compare with and without it.
bool take_block_out(TomlDocument& document, const std::string& setting) {
  constexpr std::string_view none = "=none";
  if (!setting.ends_with(none)) return false;
  std::string_view key(setting);
  key.remove_suffix(none.size());
  toml::table* parent = &document.root;
  if (key.starts_with("second.") && document.root["second"].is_table()) {
    parent = document.root["second"].as_table();
    key.remove_prefix(std::string_view("second.").size());
  }
  constexpr std::string_view blocks[] = {"treble_bleed", "tone",  "cable", "second",
                                         "selector",     "blend", "then",  "extra"};
  if (std::find(std::begin(blocks), std::end(blocks), key) == std::end(blocks)) return false;
  parent->erase(key);
  return true;
}

}  // namespace

void apply_settings_and_catalogue(TomlDocument& document, const std::vector<std::string>& settings) {
  name_entries(document);
  for (const std::string& setting : settings) {
    if (take_block_out(document, setting)) continue;
    apply_setting(document, setting);
    name_entries(document);
  }
  at_each_block(document.root, [&](toml::table& parent, std::string_view kind, const std::string& dotted) {
    toml::table* block = parent[kind].as_table();
    if (block != nullptr && block->contains(kCatalogueKey)) fill_in(document, *block, kind, dotted);
  });
}

}  // namespace unsoldered
