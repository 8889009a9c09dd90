#include "src/hookup_options.h"

#include <iostream>

#include "dsp/error.h"
#include "src/hookup_file.h"

namespace unsoldered {

Hookup HookupOptions::read() const {
  const Hookup hookup = read_hookup(file, settings);
  if (right && !has_right_gang(hookup))
    throw InputError("--right: no pot of " + file + " has a second gang; give one a right = { resistance = \"…\" }");
  if (hookup.second && hookup.selector.use == SelectorUse::both)
    std::cerr << "unsoldered: the numbers are of the first source; the second one loads it and is at rest\n";
  return right ? right_half(hookup) : hookup;
}

void add_hookup_options(CLI::App& verb, HookupOptions& options) {
  verb.add_option("HOOKUP", options.file, "Hookup file (*.hookup.toml)")->required();
  verb.add_option("--set", options.settings,
                  "Overrides a value of the hookup, such as tone.dial=4; treble_bleed=none takes\n"
                  "a block out; may be repeated")
      ->allow_extra_args(false)
      ->type_name("KEY=VALUE");
  verb.add_flag("--right", options.right, "The second gang of stereo pots (right = { ... }) instead of the first");
}

void add_json_option(CLI::App& verb, bool& json) {
  verb.add_flag("--json", json, "JSON instead of CSV: an array of objects with the same names");
}

}  // namespace unsoldered
