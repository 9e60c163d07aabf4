// SPDX-License-Identifier: GPL-3.0-or-later
// S(z) = erf(sqrt(pi) z / 2), S'(z) = exp(-pi z^2 / 4).
#pragma once

#include "sigmoid/family.h"

namespace kneeprint {

SigmoidFamily erf_family();

}  // namespace kneeprint
