// SPDX-License-Identifier: GPL-3.0-or-later
// S(z) = z / (1 + |z|^p)^(1/p), sharpness p from 1 to 40: p = 2 is the square-root sigmoid, large p
// approaches a hard clipper. S'(z) = (1 + |z|^p)^(-1-1/p).
#pragma once

#include "sigmoid/family.h"

namespace kneeprint {

SigmoidFamily algebraic_family();

}  // namespace kneeprint
