// The catalogue of generic parts, and hookup files that name its entries.
//
//   load = "valve amplifier input"                                       the block is the entry
//   cable = { catalogue = "instrument cable, 5 m", length = "7 m" }      the entry with values overridden
//
// [source], [volume], [treble_bleed], [tone], [cable], [load] and a stage's buffer may do so, also inside [second] and
// [[then]]. A key that says the same in another way (a cable's `capacitance`) puts the entry's aside.
#pragma once

#include <string>
#include <string_view>
#include <vector>

#include "src/toml_document.h"

namespace unsoldered {

struct CatalogueEntry {
  std::string kind;  // "source", "volume", … as in a hookup file
  std::string name;
  std::string values;  // TOML key by key, in the catalogue's order: `resistance = '1M', capacitance = '120 pF'`
  std::string source;  // "common practice", or where the values come from
};

/// All entries, kind by kind.
const std::vector<CatalogueEntry>& catalogue();

/// In the order of the catalogue.
std::vector<std::string_view> catalogue_kinds();

/// Null when there is none.
const CatalogueEntry* find_in_catalogue(std::string_view kind, std::string_view name);

/// The name of that kind which `name` is most likely meant to be; empty when none is near.
std::string_view nearest_in_catalogue(std::string_view kind, std::string_view name);

/// Lays the settings of --set over a parsed hookup, in order, and puts the entries of the catalogue in the place of
/// their names. Settings may name entries and override their values. Throws InputError, with the place of a name that
/// the catalogue does not have.
void apply_settings_and_catalogue(TomlDocument& document, const std::vector<std::string>& settings);

}  // namespace unsoldered
