// SPDX-License-Identifier: GPL-3.0-or-later
// A plan on a given rig becomes rungs and takes.
#pragma once

#include <string>
#include <vector>

#include "method/method.h"
#include "print/plan.h"
#include "rig/rig_file.h"

namespace kneeprint {

/// What reading needs of the rig. Levels are dBu only when send and return are both calibrated.
RigView view_of(const Rig& rig);

/// A plan's level at this rig's send. Throws InputError when it is in dBu, dBV or volts and the rig
/// is uncalibrated, or above 0 dBFS.
LevelDbfs send_level(const PlanLevel& level, const Rig& rig, const std::string& field);

/// The guard's ceiling: the lowest of the plan's, the rig file's and `asked`; -20 dBFS on a live
/// device without a rig file when nobody names another; 0 dBFS otherwise.
LevelDbfs ceiling_of(const Plan& plan, const Rig& rig, std::optional<LevelDbfs> asked,
                     bool has_rig_file);

struct Ladder {
  std::vector<LevelDbfs> rungs;  ///< ascending, none above the ceiling
  bool cut_by_ceiling = false;
};
/// Throws InputError when not one rung is under the ceiling.
Ladder ladder_of(const Plan& plan, const Rig& rig, LevelDbfs ceiling);

/// The takes of one rung, in order, each with its first hold.
std::vector<TakeSpec> takes_of_rung(const Plan& plan, const Rig& rig, LevelDbfs send, int rung);

/// Number of the take in the journal; 0 is the chain check.
int take_number(const Plan& plan, int rung, int index);
int takes_per_rung(const Plan& plan);

/// The steady frequency that the fit uses: the plan's own, else the one nearest to 997 Hz (0:
/// none).
double fit_frequency(const Plan& plan);

/// Throws InputError when a method's tones do not fit below half the rate.
void check_rate(const Plan& plan, Hertz rate);

}  // namespace kneeprint
