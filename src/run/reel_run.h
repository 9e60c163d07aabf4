// SPDX-License-Identifier: GPL-3.0-or-later
// Measuring by recording: one WAV with every stimulus of a plan, and the reading of what came back.
#pragma once

#include <filesystem>
#include <optional>

#include "run/measure.h"

namespace kneeprint {

/// Writes plan.json, rig.json, the journal's first line and reel.wav. Returns the reel's length.
Seconds write_reel(const MeasureRequest& request);

/// How the recorder ran, as markers and steady tones tell.
struct RecorderRun {
  double speed = 0.0;  ///< mean relative error between the markers, positive when fast
  /// Peak deviation of the relative speed between 0.5 and 10 Hz, the largest of the takes whose
  /// tone tells it to a tenth. Empty: no take shows a significant one.
  std::optional<double> flutter;
};

/// Finds the reel in `recording` (channel from 1), cuts and keeps every take. A later recording of
/// the same reel replaces the takes of an earlier one. Throws InputError: no reel, another plan's
/// reel, cut short, edited.
RecorderRun ingest_reel(const std::filesystem::path& folder, const std::filesystem::path& recording,
                        int channel, Progress& progress);

}  // namespace kneeprint
