// SPDX-License-Identifier: GPL-3.0-or-later
// From kept takes to curves.
#pragma once

#include "curve/points.h"
#include "method/method.h"
#include "print/folder.h"
#include "run/schedule.h"

namespace kneeprint {

/// The spec of a kept take, from its journal line.
TakeSpec spec_of(const JournalTake& take, const Plan& plan, const Rig& rig);

/// Reads one kept take from the folder, appends its points, returns the verdict.
TakeVerdict read_take(const PrintFolder& folder, const JournalTake& take, const Plan& plan,
                      const Rig& rig, Curves& out);

/// Every take of the folder, in the order of their numbers; upright; relative on an undeclared
/// reel. Throws NothingUsable when there is no take but the chain check.
Curves read_takes(const PrintFolder& folder, const Journal& journal, const Plan& plan,
                  const Rig& rig);

/// Polarity as read at the fit frequency, before the curves were made upright: -1, 0, +1.
int polarity_of(const Curves& curves, const Plan& plan);

}  // namespace kneeprint
