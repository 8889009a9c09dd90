// What is wrong with a command line, in words: the option parser knows, but says it for programmers.
#pragma once

#include <CLI/CLI.hpp>
#include <string>

namespace unsoldered {

/// The message for a line that `app` refused with `error`: what was given or is missing, what is accepted, where the
/// help is. Without the program's name in front.
std::string call_error_text(const CLI::App& app, const CLI::ParseError& error);

}  // namespace unsoldered
