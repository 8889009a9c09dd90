// unsoldered response HOOKUP [--dial 10,5] [--at HZ,… | --from --to --points]
#include <cmath>
#include <memory>
#include <string>
#include <vector>

#include "dsp/error.h"
#include "dsp/hookup_network.h"
#include "dsp/nodal.h"
#include "dsp/quantity.h"
#include "src/cancel.h"
#include "src/dial_list.h"
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
  std::string at;
  std::string from = "20";
  std::string to = "20000";
  int points = 61;
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
  const double from = parse_frequency(options.from, "--from");
  const double to = parse_frequency(options.to, "--to");
  if (from >= to)
    throw InputError("--from " + options.from + " --to " + options.to + ": the first frequency must be the lower one");
  if (options.points < 2 || options.points > most_points)
    throw InputError("--points " + std::to_string(options.points) + ": accepted are 2 to " + std::to_string(most_points));
  std::vector<double> frequencies;
  for (int i = 0; i < options.points; ++i)
    frequencies.push_back(i == options.points - 1 ? to : from * std::pow(to / from, double(i) / (options.points - 1)));
  return frequencies;
}

void run(const ResponseOptions& options) {
  const std::vector<double> dials = parse_dials(options.dials, "--dial");
  const std::vector<double> frequencies =
      options.at.empty() ? spread_frequencies(options) : listed_frequencies(options.at);
  const Hookup hookup = options.hookup.read();
  Table table{{"dial", "frequency_hz", "level_db", "phase_deg", "group_delay_us"}, {}};
  for (const double dial : dials) {
    NodalAnalysis analysis(hookup_network(hookup, dial));
    for (const double frequency : frequencies) {
      stop_if_interrupted();
      const Transfer transfer = analysis.transfer(frequency);
      if (std::norm(transfer.value) > 0)
        table.rows.push_back(
            {dial, frequency, transfer.level_db(), transfer.phase_deg(), 1e6 * transfer.group_delay_s()});
      else
        table.rows.push_back({dial, frequency, transfer.level_db(), {}, {}});
    }
  }
  print_table(table, options.hookup.json);
}

}  // namespace

void add_response_verb(CLI::App& app, VerbAction& action) {
  const auto options = std::make_shared<ResponseOptions>();
  CLI::App* verb = app.add_subcommand("response", "Frequency response from the source's emf to the grid of the load");
  add_hookup_options(*verb, options->hookup);
  verb->add_option("--dial", options->dials, "Knob positions 0 to 10 (default 10)")->type_name("10,5");
  CLI::Option* at = verb->add_option("--at", options->at, "Frequencies in Hz")->type_name("HZ,HZ,...");
  verb->add_option("--from", options->from, "Lowest frequency (default 20 Hz)")->type_name("HZ")->excludes(at);
  verb->add_option("--to", options->to, "Highest frequency (default 20 kHz)")->type_name("HZ")->excludes(at);
  verb->add_option("--points", options->points, "How many, evenly over log frequency (default 61)")
      ->type_name("N")
      ->excludes(at);
  add_json_option(*verb, options->hookup.json);
  verb->footer(
      "Examples:\n"
      "  unsoldered response 500k-audio.hookup.toml --dial 10,7 --at 100,1k,5k\n"
      "  unsoldered response 500k-audio.hookup.toml --from 20 --to 20k --points 200 --json\n"
      "  unsoldered response 500k-audio.hookup.toml --dial 7 --set cable.length=\"10 m\"\n"
      "\n"
      "Columns: dial, frequency_hz, level_db (re the emf), phase_deg, group_delay_us (-d phase/d omega).\n"
      "With no signal the level is -inf and the rest empty. Exit status: 0 done, 2 the input or the call is wrong.");
  verb->callback([options, &action] { action = [options] { run(*options); }; });
}

}  // namespace unsoldered
