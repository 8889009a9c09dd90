// The two ways a call can fail, as told to the user by the exit status of the commands.
#pragma once

#include <stdexcept>

namespace unsoldered {

/// What was given (a value, a file's contents, an option) cannot be accepted; exit status 2.
/// The message says where, the value with its unit, what is accepted and the next step.
class InputError : public std::runtime_error {
 public:
  using std::runtime_error::runtime_error;
};

/// The request is fine but could not be carried out (disk full, no permission); exit status 3.
class CannotError : public std::runtime_error {
 public:
  using std::runtime_error::runtime_error;
};

}  // namespace unsoldered
