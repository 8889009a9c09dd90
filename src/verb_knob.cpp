// unsoldered knob HOOKUP [--steps 41]
#include <algorithm>
#include <cstddef>
#include <iostream>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "dsp/knob_table.h"
#include "src/cancel.h"
#include "src/count_option.h"
#include "src/dial_list.h"
#include "src/hookup_file.h"
#include "src/hookup_options.h"
#include "src/table_text.h"
#include "src/verb.h"

namespace unsoldered {
namespace {

constexpr int most_steps = 10001;
constexpr std::size_t portion = 200;  // rows: some hundredths of a second

struct KnobOptions {
  HookupOptions hookup;
  std::string steps = "41";
  std::string knob = "volume";
  std::string dial = "10";
};

Cell cell(const std::optional<double>& value) { return value ? Cell(*value) : Cell(); }

/// Rows in portions, so that Ctrl-C is heard between them.
std::vector<KnobRow> rows_at(const Hookup& hookup, const Knob& knob, const std::vector<double>& dials) {
  std::vector<KnobRow> rows;
  for (std::size_t start = 0; start < dials.size(); start += portion) {
    stop_if_interrupted();
    const auto from = dials.begin() + static_cast<std::ptrdiff_t>(start);
    const auto to = dials.begin() + static_cast<std::ptrdiff_t>(std::min(start + portion, dials.size()));
    const std::vector<KnobRow> part = knob_table(hookup, {from, to}, knob);
    rows.insert(rows.end(), part.begin(), part.end());
  }
  return rows;
}

void run(const KnobOptions& options) {
  const int steps = parse_count(options.steps, "--steps", 2, most_steps);
  Hookup hookup = options.hookup.read();
  hookup.volume.dial = parse_dial(options.dial, "--dial");
  const Knob knob = of_hookup(options.hookup.file, [&] { return parse_knob(hookup, options.knob); });
  const std::vector<KnobRow> rows =
      of_hookup(options.hookup.file, [&] { return rows_at(hookup, knob, even_dials(steps)); });
  Table table{{"dial", "degrees", "element_fraction", "level_db", "treble_lost_db", "treble_5k_1k_db", "corner_hz",
               "peak_hz", "peak_db", "output_ohm", "noise_uv"},
              {}};
  for (const KnobRow& row : rows)
    table.rows.push_back({row.dial, row.degrees, row.element_fraction, row.level_db, cell(row.treble_lost_db),
                          cell(row.treble_5k_1k_db), cell(row.corner_hz), cell(row.peak_hz), cell(row.peak_db),
                          row.output_ohm, row.noise_uv});
  if (hookup.second && hookup.selector.use == SelectorUse::second && knob == Knob::volume)
    std::cerr << "unsoldered knob: this hookup uses the second source alone, so the volume knob of the first changes "
                 "nothing; --knob second.volume is the other's\n";
  print_table(table, options.hookup.json);
}

}  // namespace

void add_knob_verb(CLI::App& app, VerbAction& action) {
  const auto options = std::make_shared<KnobOptions>();
  CLI::App* verb =
      app.add_subcommand("knob", "The loaded taper: level, treble lost and more at every position of a knob");
  add_hookup_options(*verb, options->hookup);
  verb->add_option("--steps", options->steps, "Rows, evenly from dial 0 to 10; 2 to 10001 (default 41)")
      ->type_name("N");
  verb->add_option("--knob", options->knob,
                   "The knob that is turned: volume (default), tone, second.volume, second.tone,\n"
                   "blend, pedal, then.0.volume, then.0.tone, extra.0")
      ->type_name("KNOB");
  verb->add_option("--dial", options->dial, "Where the volume stands while another knob is turned (default 10)")
      ->type_name("DIAL");
  add_json_option(*verb, options->hookup.json);
  verb->footer(
      "Examples (in the source folder; not installed: ./run in place of unsoldered):\n"
      "  unsoldered knob assets/demo/a-500k-audio-short-cable.hookup.toml\n"
      "  unsoldered knob assets/demo/a-500k-audio-short-cable.hookup.toml --steps 11 --set volume.taper=linear\n"
      "  unsoldered knob assets/demo/pedal-250k.hookup.toml --knob pedal --dial 7\n"
      "\n"
      "Columns\n"
      "  dial              knob position, 0 to 10\n"
      "  degrees           of mechanical travel\n"
      "  element_fraction  share of the pot's resistance below the wiper, 0 to 1\n"
      "  level_db          at 1 kHz, relative to the emf, the ideal generator inside the source\n"
      "  treble_lost_db    2-5 kHz against 200-800 Hz (line source: 5-15 kHz), in dB since 10; positive is duller\n"
      "  treble_5k_1k_db   level at 5 kHz minus level at 1 kHz\n"
      "  corner_hz         lowest frequency above 1 kHz that is 3.0103 dB below 1 kHz\n"
      "  peak_hz, peak_db  the highest peak of the response, relative to the emf\n"
      "  output_ohm        impedance at 1 kHz looking back from the output, cable and load removed\n"
      "  noise_uv          Johnson noise at the load, 20 Hz to 20 kHz, 20 degrees Celsius, microvolt rms\n"
      "What does not exist is empty, no signal is -inf (both null in JSON).\n"
      "Exit status: 0 done, 2 the input or the call is wrong, 3 it could not be carried out, 130 interrupted.");
  verb->callback([options, &action] { action = [options] { run(*options); }; });
}

}  // namespace unsoldered
