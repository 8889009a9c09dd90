// Whole numbers as given on the command line.
#pragma once

#include <string>

namespace unsoldered {

/// `text` as a whole number from `low` to `high`; `where` opens the message ("--steps"). Throws InputError.
int parse_count(const std::string& text, const std::string& where, int low, int high);

}  // namespace unsoldered
