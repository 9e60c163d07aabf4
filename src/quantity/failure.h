// SPDX-License-Identifier: GPL-3.0-or-later
// What can go wrong, as the exit code that scripts see and a sentence that a technician
// understands. Thrown anywhere but in the audio callback; caught once, in the command line's main
// or in the desk.
#pragma once

#include <stdexcept>
#include <string>

namespace kneeprint {

enum class ExitCode {
  done = 0,
  wrong_usage = 2,
  bad_input = 3,       ///< a file: the message names file, field or byte, and what was expected
  device_failed = 4,   ///< the audio device
  guard_stopped = 5,   ///< the guard ended the run; what was taken is kept
  nothing_usable = 6,  ///< the run ended, and no point of it can be used
};

class Failure : public std::runtime_error {
 public:
  Failure(ExitCode code, const std::string& sentence) : std::runtime_error(sentence), code_(code) {}
  ExitCode code() const { return code_; }

 private:
  ExitCode code_;
};

struct UsageError : Failure {
  explicit UsageError(const std::string& s) : Failure(ExitCode::wrong_usage, s) {}
};
struct InputError : Failure {
  explicit InputError(const std::string& s) : Failure(ExitCode::bad_input, s) {}
};
struct DeviceError : Failure {
  explicit DeviceError(const std::string& s) : Failure(ExitCode::device_failed, s) {}
};
struct GuardStop : Failure {
  explicit GuardStop(const std::string& s) : Failure(ExitCode::guard_stopped, s) {}
};
struct NothingUsable : Failure {
  explicit NothingUsable(const std::string& s) : Failure(ExitCode::nothing_usable, s) {}
};

}  // namespace kneeprint
