#include "src/dial_list.h"

#include <string>

#include "dsp/error.h"
#include "src/number_text.h"

namespace unsoldered {

double parse_dial(std::string_view text, std::string_view where) {
  const auto dial = parse_number(text);
  if (!dial) {
    throw InputError(std::string(where) + ": \"" + std::string(text) +
                     "\" is not a dial position; write a number from 0 to 10, such as 7.5");
  }
  if (*dial < 0 || *dial > 10) {
    throw InputError(std::string(where) + ": dial " + format_number(*dial) +
                     " is off the scale; a knob goes from 0 to 10, so give a number in that range");
  }
  return *dial;
}

std::vector<double> parse_dials(std::string_view text, std::string_view where) {
  if (text.find(';') != std::string_view::npos) {
    throw InputError(std::string(where) + ": \"" + std::string(text) +
                     "\" is not a dial position, nor a list of them; write numbers from 0 to 10 with a comma between "
                     "them, such as 10,7.5,3");
  }
  std::vector<double> dials;
  for (;;) {
    const auto comma = text.find(',');
    dials.push_back(parse_dial(text.substr(0, comma), where));
    if (comma == std::string_view::npos) return dials;
    text.remove_prefix(comma + 1);
  }
}

}  // namespace unsoldered
