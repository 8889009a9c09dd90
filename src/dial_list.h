// Dial positions as given on the command line: "10,7,3".
#pragma once

#include <string_view>
#include <vector>

namespace unsoldered {

/// One dial position, 0 to 10; `where` opens the message ("--dial"). Throws InputError.
double parse_dial(std::string_view text, std::string_view where);

/// Positions separated by commas, in the order given, at least one. Throws InputError.
std::vector<double> parse_dials(std::string_view text, std::string_view where);

}  // namespace unsoldered
