// SPDX-License-Identifier: GPL-3.0-or-later
// A measurement from the first tone to the report: climb the ladder, keep takes, read, fit,
// publish.
#pragma once

#include <filesystem>
#include <optional>
#include <string>

#include "rig/port.h"
#include "run/progress.h"
#include "run/schedule.h"

namespace kneeprint {

struct MeasureRequest {
  std::filesystem::path into;
  Plan plan;
  Rig rig;
  bool has_rig_file = false;
  std::optional<LevelDbfs> ceiling;  ///< named on the command line
  std::string unit;                  ///< what the user says is being measured
  std::uint64_t seed = 1;
  bool resume = false;
};

/// How the climb ended. `stop` is empty when every rung up to the top was taken.
struct ClimbEnd {
  std::string stop;  ///< stable id, as in the journal
  std::string sentence;
  bool by_guard = false;  ///< exit 5 after what was taken is read
};

/// Climbs the ladder on `port` and keeps every take. With `resume`, takes already kept are read
/// instead of played. Throws InputError, DeviceError, NothingUsable; a guard's stop is a ClimbEnd.
ClimbEnd climb(const MeasureRequest& request, Port& port, Progress& progress);

}  // namespace kneeprint
