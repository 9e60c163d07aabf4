// SPDX-License-Identifier: GPL-3.0-or-later
// S(z) = (2 / pi) atan(pi z / 2), S'(z) = 1 / (1 + (pi z / 2)^2).
#pragma once

#include "sigmoid/family.h"

namespace kneeprint {

SigmoidFamily atan_family();

}  // namespace kneeprint
