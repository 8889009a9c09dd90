// The system's own words for an errno, and what to do about it.
#pragma once

#include <cerrno>
#include <string>
#include <system_error>

namespace unsoldered {

inline std::string system_text(int error) { return std::generic_category().message(error); }

/// What to do when a file cannot be written for that reason.
inline std::string write_advice(int error) {
  if (error == ENOSPC || error == EDQUOT) return "free some space there, or give another folder";
  if (error == EFBIG)
    return "this system or this user may not have a file that large; shorten the take or give another folder";
  return "give another folder, or see to the permissions and the disk of this one";
}

}  // namespace unsoldered
