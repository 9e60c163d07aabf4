// SPDX-License-Identifier: GPL-3.0-or-later
// A cable in place of a unit: what it shows is the rig.
#pragma once

#include "unit/unit.h"

namespace kneeprint {

extern const UnitRecord kWireUnit;

}  // namespace kneeprint
