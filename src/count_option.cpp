#include "src/count_option.h"

#include <charconv>
#include <system_error>

#include "dsp/error.h"

namespace unsoldered {

int parse_count(const std::string& text, const std::string& where, int low, int high) {
  int count = 0;
  const char* end = text.data() + text.size();
  const auto read = std::from_chars(text.data(), end, count);
  const bool whole = !text.empty() && read.ptr == end && read.ec != std::errc::invalid_argument;
  if (whole && read.ec == std::errc() && count >= low && count <= high) return count;
  throw InputError(where + ": \"" + text + (whole ? "\" is out of range" : "\" is not a whole number") +
                   "; give a whole number from " + std::to_string(low) + " to " + std::to_string(high));
}

}  // namespace unsoldered
