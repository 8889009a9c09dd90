// unsoldered netlist HOOKUP --dial 5
#include <memory>
#include <string>

#include "src/dial_list.h"
#include "src/hookup_file.h"
#include "src/hookup_options.h"
#include "src/netlist.h"
#include "src/table_text.h"
#include "src/verb.h"

namespace unsoldered {
namespace {

struct NetlistOptions {
  HookupOptions hookup;
  std::string dial = "10";
};

void run(const NetlistOptions& options) {
  const double dial = parse_dial(options.dial, "--dial");
  const Hookup hookup = options.hookup.read();
  print_text(of_hookup(options.hookup.file, [&] { return netlist_text(hookup, dial); }));
}

}  // namespace

void add_netlist_verb(CLI::App& app, VerbAction& action) {
  const auto options = std::make_shared<NetlistOptions>();
  CLI::App* verb = app.add_subcommand("netlist", "The circuit at one knob position as a complete ngspice deck");
  add_hookup_options(*verb, options->hookup);
  verb->add_option("--dial", options->dial, "Knob position 0 to 10 (default 10)")->type_name("DIAL");
  verb->footer(
      "Examples (in the source folder; not installed: ./run in place of unsoldered):\n"
      "  unsoldered netlist assets/demo/a-500k-audio-short-cable.hookup.toml --dial 5 > at-5.cir\n"
      "  ngspice -b at-5.cir\n"
      "\n"
      "Values are in ohm, farad and henry; wires are sources of 0 V. The emf is Vemf at node emf, the output node is\n"
      "grid. The deck asks for 20 Hz to 20 kHz, 20 points a decade; ngspice prints level in dB and phase in radian.\n"
      "Exit status: 0 done, 2 the input or the call is wrong, 3 it could not be carried out, 130 interrupted.");
  verb->callback([options, &action] { action = [options] { run(*options); }; });
}

}  // namespace unsoldered
