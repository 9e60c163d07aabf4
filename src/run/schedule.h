// SPDX-License-Identifier: GPL-3.0-or-later
// A plan on a given rig becomes rungs and takes.
#pragma once

#include <optional>
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

/// The takes of one rung, in order, each with its first hold and its number. `down`: those that are
/// taken again on the way down.
std::vector<TakeSpec> takes_of_rung(const Plan& plan, const Rig& rig, LevelDbfs send, int rung,
                                    bool down = false);
/// The takes before the ladder (at its lowest rung) or after it (at the highest rung reached).
std::vector<TakeSpec> takes_aside(const Plan& plan, const Rig& rig, Placement placement,
                                  LevelDbfs send, int rung);

/// The spec behind a take's number, at the level and rung that the journal tells. Empty: no take of
/// this plan has that number. Numbers do not depend on where the ladder ended: 0 is the chain
/// check, then follow the takes before and after the ladder, then rung by rung those on the way up
/// and, when the plan descends, down.
std::optional<TakeSpec> take_by_number(const Plan& plan, const Rig& rig, int number, LevelDbfs send,
                                       int rung);

/// The steady frequency that the fit uses: the plan's own, else the one nearest to 997 Hz (0:
/// none).
double fit_frequency(const Plan& plan);

/// Throws InputError when a method's tones do not fit below half the rate.
void check_rate(const Plan& plan, Hertz rate);

}  // namespace kneeprint
