// What every verb that reads one hookup takes: HOOKUP, --set, --right and --json.
#pragma once

#include <CLI/CLI.hpp>
#include <string>
#include <vector>

#include "dsp/hookup.h"

namespace unsoldered {

struct HookupOptions {
  std::string file;
  std::vector<std::string> settings;
  bool right = false;
  bool json = false;

  /// The hookup, with --right as its stereo pots' second gangs have it.
  Hookup read() const;
};

void add_hookup_options(CLI::App& verb, HookupOptions& options);
void add_json_option(CLI::App& verb, bool& json);

}  // namespace unsoldered
