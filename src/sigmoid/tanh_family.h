// SPDX-License-Identifier: GPL-3.0-or-later
// S(z) = tanh z, S'(z) = 1 / cosh^2 z.
#pragma once

#include "sigmoid/family.h"

namespace kneeprint {

SigmoidFamily tanh_family();

}  // namespace kneeprint
