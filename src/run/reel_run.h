// SPDX-License-Identifier: GPL-3.0-or-later
// Measuring by recording: one WAV with every stimulus of a plan, and the reading of what came back.
#pragma once

#include <filesystem>

#include "run/measure.h"

namespace kneeprint {

/// Writes plan.json, rig.json, the journal's first line and reel.wav. Returns the reel's length.
Seconds write_reel(const MeasureRequest& request);

/// Finds the reel in `recording` (channel from 1), cuts and keeps every take. A later recording of
/// the same reel replaces the takes of an earlier one. Throws InputError: no reel, another plan's
/// reel, cut short, edited.
void ingest_reel(const std::filesystem::path& folder, const std::filesystem::path& recording,
                 int channel, Progress& progress);

}  // namespace kneeprint
