// unsoldered: the commands. Needs no display and links no graphics.
#include <CLI/CLI.hpp>
#include <cstdio>
#include <iostream>
#include <new>

#include "dsp/error.h"
#include "src/call_error.h"
#include "src/cancel.h"
#include "src/verb.h"

namespace {

constexpr int exit_done = 0;
constexpr int exit_wrong_input = 2;
constexpr int exit_cannot = 3;
constexpr int exit_interrupted = 130;

int run_action(const unsoldered::VerbAction& action, const std::string& verb) {
  const auto say = [&](const char* message) { std::cerr << "unsoldered " << verb << ": " << message << '\n'; };
  try {
    action();
    return exit_done;
  } catch (const unsoldered::InputError& error) {
    say(error.what());
    return exit_wrong_input;
  } catch (const unsoldered::Interrupted&) {
    say("interrupted; nothing was left half done");
    return exit_interrupted;
  } catch (const std::bad_alloc&) {
    say("out of memory; close other programs or ask for less at a time");
  } catch (const std::exception& error) {
    say(error.what());
  }
  return exit_cannot;
}

}  // namespace

int main(int argc, char** argv) {
  unsoldered::watch_for_interrupt();
  unsoldered::VerbAction action;
  CLI::App app{
      "Unsoldered computes what a volume pot does in its circuit, level and treble at every position of the knob, and "
      "plays a recording through it."};
  app.name("unsoldered");
  app.set_version_flag("--version", "unsoldered " UNSOLDERED_VERSION);
  app.require_subcommand(0, 1);
  app.footer(
      "Each verb has its own help: unsoldered render --help\n"
      "Listening: start low and raise slowly; stop if your ears ring.");
  unsoldered::add_verbs(app, action);
  try {
    app.parse(argc, argv);
  } catch (const CLI::CallForHelp& help) {
    return app.exit(help);
  } catch (const CLI::CallForAllHelp& help) {
    return app.exit(help);
  } catch (const CLI::CallForVersion& version) {
    return app.exit(version);
  } catch (const CLI::ParseError& error) {
    const auto chosen = app.get_subcommands();
    const std::string verb = chosen.empty() ? "" : " " + chosen.front()->get_name();
    std::cerr << "unsoldered" << verb << ": " << unsoldered::call_error_text(app, error) << '\n';
    return exit_wrong_input;
  }
  if (!action) {
    std::cerr << app.help()
              << "\nunsoldered: no verb given; begin with one of those above, such as unsoldered render --help\n";
    return exit_wrong_input;
  }
  return run_action(action, app.get_subcommands().front()->get_name());
}
