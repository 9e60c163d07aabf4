// SPDX-License-Identifier: GPL-3.0-or-later
// One family fitted to the harmonics: best parameters, discrepancy, standard errors, AICc.
#pragma once

#include "sigmoid/fit.h"
#include "sigmoid/harmonic_problem.h"

namespace kneeprint {

FittedFamily fit_family(const SigmoidFamily& family, const HarmonicData& data,
                        const FitOptions& options);

}  // namespace kneeprint
