// SPDX-License-Identifier: GPL-3.0-or-later
// From curves to model: which harmonics the fit gets, and how the fitted curves do on the two-tone
// takes that it never saw.
#pragma once

#include "curve/points.h"
#include "print/plan.h"
#include "rig/rig_file.h"
#include "sigmoid/model.h"

namespace kneeprint {

/// Harmonics of the fit frequency, upright, in volts (or full scales). Points flagged clipped,
/// unsteady or alias stay out. Phases within 20 degrees of 0 or 180 give a sign; others only a
/// magnitude; points near the noise enter by their in-phase part, which is unbiased there.
std::vector<FitDatum> fit_data(const Curves& curves, const Plan& plan, const Rig& rig);

/// Fits every family and predicts the two-tone products. Throws NothingUsable when there is too
/// little to fit.
Model describe(const Curves& curves, const Plan& plan, const Rig& rig);

}  // namespace kneeprint
