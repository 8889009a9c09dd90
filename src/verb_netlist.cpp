// unsoldered netlist HOOKUP --dial 5
#include <iostream>
#include <memory>
#include <string>

#include "dsp/error.h"
#include "src/dial_list.h"
#include "src/hookup_options.h"
#include "src/netlist.h"
#include "src/verb.h"

namespace unsoldered {
namespace {

struct NetlistOptions {
  HookupOptions hookup;
  std::string dial = "10";
};

void run(const NetlistOptions& options) {
  const double dial = parse_dial(options.dial, "--dial");
  std::cout << netlist_text(options.hookup.read(), dial) << std::flush;
  if (!std::cout) throw CannotError("standard output cannot be written (disk full or a closed pipe)");
}

}  // namespace

void add_netlist_verb(CLI::App& app, VerbAction& action) {
  const auto options = std::make_shared<NetlistOptions>();
  CLI::App* verb = app.add_subcommand("netlist", "The same circuit as a complete ngspice deck");
  add_hookup_options(*verb, options->hookup);
  verb->add_option("--dial", options->dial, "Knob position 0 to 10 (default 10)")->type_name("DIAL");
  verb->footer(
      "Examples:\n"
      "  unsoldered netlist 500k-audio.hookup.toml --dial 5 > at-5.cir\n"
      "  ngspice -b at-5.cir\n"
      "\n"
      "The emf is Vemf at node emf, the output node is grid. Exit status: 0 done, 2 the input or the call is wrong.");
  verb->callback([options, &action] { action = [options] { run(*options); }; });
}

}  // namespace unsoldered
