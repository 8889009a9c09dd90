// unsoldered response HOOKUP [--dial 10,5] [--at HZ,… | --from --to --points]
#include <cmath>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "dsp/error.h"
#include "dsp/hookup_response.h"
#include "dsp/quantity.h"
#include "src/cancel.h"
#include "src/count_option.h"
#include "src/dial_list.h"
#include "src/hookup_file.h"
#include "src/hookup_options.h"
#include "src/number_text.h"
#include "src/table_text.h"
#include "src/verb.h"

namespace unsoldered {
namespace {

constexpr Range frequency_range{1e-3, 1e9};
constexpr int most_points = 1000000;

struct ResponseOptions {
  HookupOptions hookup;
  std::string dials = "10";
  std::optional<std::string> at;
  std::optional<std::string> from;
  std::optional<std::string> to;
  std::optional<std::string> points;
};

double parse_frequency(const std::string& text, const std::string& where) {
  try {
    return parse_quantity(text, Unit::hertz, frequency_range);
  } catch (const InputError& error) {
    throw InputError(where + ": " + error.what());
  }
}

std::vector<double> listed_frequencies(const std::string& list) {
  std::vector<double> frequencies;
  for (std::size_t start = 0; start <= list.size();) {
    const std::size_t comma = std::min(list.find(',', start), list.size());
    frequencies.push_back(parse_frequency(list.substr(start, comma - start), "--at"));
    start = comma + 1;
  }
  return frequencies;
}

std::vector<double> spread_frequencies(const ResponseOptions& options) {
  const double from = parse_frequency(options.from.value_or("20"), "--from");
  const double to = parse_frequency(options.to.value_or("20000"), "--to");
  if (from >= to)
    throw InputError("--from " + options.from.value_or("20") + " --to " + options.to.value_or("20000") +
                     ": the first is not below the second; give the lower frequency first, swap them");
  const int points = parse_count(options.points.value_or("61"), "--points", 2, most_points);
  std::vector<double> frequencies;
  for (int i = 0; i < points; ++i)
    frequencies.push_back(i == points - 1 ? to : from * std::pow(to / from, double(i) / (points - 1)));
  return frequencies;
}

Table response_table(const Hookup& hookup, const std::vector<double>& dials, const std::vector<double>& frequencies) {
  Table table{{"dial", "frequency_hz", "level_db", "phase_deg", "group_delay_us"}, {}};
  for (const double dial : dials) {
    HookupResponse response(hookup, dial);
    for (const double frequency : frequencies) {
      stop_if_interrupted();
      const Transfer transfer = response.transfer(frequency);
      if (std::norm(transfer.value) > 0)
        table.rows.push_back(
            {dial, frequency, transfer.level_db(), transfer.phase_deg(), 1e6 * transfer.group_delay_s()});
      else
        table.rows.push_back({dial, frequency, transfer.level_db(), {}, {}});
    }
  }
  return table;
}

void run(const ResponseOptions& options) {
  if (options.at && (options.from || options.to || options.points))
    throw InputError(
        "--at, and --from, --to or --points: frequencies are listed or spread evenly; give one of the two");
  const std::vector<double> dials = parse_dials(options.dials, "--dial");
  const std::vector<double> frequencies = options.at ? listed_frequencies(*options.at) : spread_frequencies(options);
  const Hookup hookup = options.hookup.read();
  const Table table = of_hookup(options.hookup.file, [&] { return response_table(hookup, dials, frequencies); });
  print_table(table, options.hookup.json);
}

}  // namespace

void add_response_verb(CLI::App& app, VerbAction& action) {
  const auto options = std::make_shared<ResponseOptions>();
  CLI::App* verb =
      app.add_subcommand("response", "Frequency response of a hookup: level, phase and group delay at the load");
  add_hookup_options(*verb, options->hookup);
  verb->add_option("--dial", options->dials, "Knob positions 0 to 10 (default 10)")->type_name("10,5");
  verb->add_option("--at", options->at, "Frequencies in Hz, such as 440,1k,20k; else these three:")
      ->type_name("HZ,HZ,...");
  verb->add_option("--from", options->from, "Lowest frequency (default 20 Hz)")->type_name("HZ");
  verb->add_option("--to", options->to, "Highest frequency (default 20 kHz)")->type_name("HZ");
  verb->add_option("--points", options->points, "How many, evenly over log frequency (default 61)")->type_name("N");
  add_json_option(*verb, options->hookup.json);
  verb->footer(
      "Examples (in the source folder; not installed: ./run in place of unsoldered):\n"
      "  unsoldered response assets/demo/a-500k-audio-short-cable.hookup.toml --dial 10,7 --at 100,1k,5k\n"
      "  unsoldered response assets/demo/a-500k-audio-short-cable.hookup.toml --from 20 --to 20k --points 200 --json\n"
      "  unsoldered response assets/demo/a-500k-audio-short-cable.hookup.toml --dial 7 --set cable.length=\"10 m\"\n"
      "\n"
      "Columns: dial; frequency_hz; level_db, relative to the emf, the ideal generator inside the source; phase_deg;\n"
      "group_delay_us, minus the derivative of phase by angular frequency, in microseconds. Rows go dial by dial.\n"
      "With no signal the level is -inf and the rest empty (null in JSON).\n"
      "Exit status: 0 done, 2 the input or the call is wrong, 3 it could not be carried out, 130 interrupted.");
  verb->callback([options, &action] { action = [options] { run(*options); }; });
}

}  // namespace unsoldered
