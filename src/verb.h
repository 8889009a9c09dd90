// How a command verb plugs into the program: one file verb_NAME.cpp each, listed once in verbs.cpp.
#pragma once

#include <CLI/CLI.hpp>
#include <functional>

namespace unsoldered {

/// What a verb leaves behind for main() to run after parsing.
using VerbAction = std::function<void()>;

/// Adds the subcommand's options to `app` and, when it is chosen on the command line, sets `action`.
using AddVerb = void (*)(CLI::App& app, VerbAction& action);

/// Adds them all.
void add_verbs(CLI::App& app, VerbAction& action);

void add_response_verb(CLI::App& app, VerbAction& action);
void add_knob_verb(CLI::App& app, VerbAction& action);
void add_netlist_verb(CLI::App& app, VerbAction& action);
void add_render_verb(CLI::App& app, VerbAction& action);
void add_catalogue_verb(CLI::App& app, VerbAction& action);

}  // namespace unsoldered
