// unsoldered catalogue [KIND]
#include <algorithm>
#include <memory>
#include <optional>
#include <string>

#include "dsp/error.h"
#include "src/catalogue.h"
#include "src/hookup_options.h"
#include "src/table_text.h"
#include "src/toml_block.h"
#include "src/verb.h"

namespace unsoldered {
namespace {

struct CatalogueOptions {
  std::optional<std::string> kind;
  bool json = false;
};

void run(const CatalogueOptions& options) {
  const std::vector<std::string_view> kinds = catalogue_kinds();
  if (options.kind && std::find(kinds.begin(), kinds.end(), *options.kind) == kinds.end()) {
    const std::string_view near = nearest(*options.kind, kinds);
    throw InputError(in_quotes(*options.kind) + " is not a kind of part" +
                     (near.empty() ? "; a" : "; was " + in_quotes(near) + " meant? A") + "ccepted are " +
                     quoted_list(kinds) + ", or none for all of them");
  }
  Table table{{"kind", "name", "values", "source"}, {}};
  for (const CatalogueEntry& entry : catalogue()) {
    if (!options.kind || entry.kind == *options.kind) {
      table.rows.push_back({entry.kind, entry.name, entry.values, entry.source});
    }
  }
  print_table(table, options.json);
}

}  // namespace

void add_catalogue_verb(CLI::App& app, VerbAction& action) {
  const auto options = std::make_shared<CatalogueOptions>();
  CLI::App* verb = app.add_subcommand("catalogue", "Typical parts that a hookup file may name");
  verb->add_option("KIND", options->kind, "source, volume, treble_bleed, tone, cable, load or buffer (default: all)");
  add_json_option(*verb, options->json);
  verb->footer(
      "Examples (in the source folder; not installed: ./run in place of unsoldered):\n"
      "  unsoldered catalogue\n"
      "  unsoldered catalogue load\n"
      "  unsoldered knob assets/demo/a-500k-audio-short-cable.hookup.toml --steps 3 --set load=\"line input\"\n"
      "\n"
      "In a hookup file\n"
      "  load = \"valve amplifier input\"\n"
      "      the block is the entry\n"
      "  cable = { catalogue = \"instrument cable, 5 m\", length = \"7 m\" }\n"
      "      the entry, with every key given beside it in place of the entry's own\n"
      "also in [second] and [[then]]. The values are typical ones, of no certain make; measure yours.\n"
      "Columns: kind, the block it stands for; name; values, the keys of that block; source, where they come from.\n"
      "Exit status: 0 done, 2 the input or the call is wrong, 3 it could not be carried out.");
  verb->callback([options, &action] { action = [options] { run(*options); }; });
}

}  // namespace unsoldered
