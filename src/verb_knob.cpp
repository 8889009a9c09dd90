// unsoldered knob HOOKUP [--steps 41]
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "dsp/error.h"
#include "dsp/knob_table.h"
#include "src/hookup_options.h"
#include "src/table_text.h"
#include "src/verb.h"

namespace unsoldered {
namespace {

constexpr int most_steps = 10001;

struct KnobOptions {
  HookupOptions hookup;
  int steps = 41;
};

Cell cell(const std::optional<double>& value) { return value ? Cell(*value) : Cell(); }

void run(const KnobOptions& options) {
  if (options.steps < 2 || options.steps > most_steps)
    throw InputError("--steps " + std::to_string(options.steps) + ": accepted are 2 to " + std::to_string(most_steps));
  const std::vector<KnobRow> rows = knob_table(options.hookup.read(), even_dials(options.steps));
  Table table{{"dial", "degrees", "element_fraction", "level_db", "treble_lost_db", "treble_5k_1k_db", "corner_hz",
               "peak_hz", "peak_db", "output_ohm", "noise_uv"},
              {}};
  for (const KnobRow& row : rows)
    table.rows.push_back({row.dial, row.degrees, row.element_fraction, row.level_db, cell(row.treble_lost_db),
                          cell(row.treble_5k_1k_db), cell(row.corner_hz), cell(row.peak_hz), cell(row.peak_db),
                          row.output_ohm, row.noise_uv});
  print_table(table, options.hookup.json);
}

}  // namespace

void add_knob_verb(CLI::App& app, VerbAction& action) {
  const auto options = std::make_shared<KnobOptions>();
  CLI::App* verb = app.add_subcommand("knob", "The loaded taper: level, treble loss and more at every knob position");
  add_hookup_options(*verb, options->hookup);
  verb->add_option("--steps", options->steps, "Rows from dial 0 to 10 (default 41)")->type_name("N");
  add_json_option(*verb, options->hookup.json);
  verb->footer(
      "Examples:\n"
      "  unsoldered knob 500k-audio.hookup.toml\n"
      "  unsoldered knob 500k-audio.hookup.toml --steps 11 --set volume.taper=linear\n"
      "\n"
      "Columns: dial; degrees of travel; element_fraction below the wiper; level_db at 1 kHz re the emf;\n"
      "treble_lost_db since 10 (positive is duller); treble_5k_1k_db; corner_hz, 3.0103 dB below 1 kHz; peak_hz and\n"
      "peak_db, the highest peak; output_ohm at 1 kHz, cable and load removed; noise_uv, Johnson noise at the load,\n"
      "20 Hz to 20 kHz. What does not exist is empty. Exit status: 0 done, 2 the input or the call is wrong.");
  verb->callback([options, &action] { action = [options] { run(*options); }; });
}

}  // namespace unsoldered
