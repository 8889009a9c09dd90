// The system's own words for an errno.
#pragma once

#include <string>
#include <system_error>

namespace unsoldered {

inline std::string system_text(int error) { return std::generic_category().message(error); }

}  // namespace unsoldered
