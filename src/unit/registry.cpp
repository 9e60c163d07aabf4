// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/format.h>

#include <array>

#include "quantity/failure.h"
#include "unit/diode.h"
#include "unit/push_pull.h"
#include "unit/sigmoid.h"
#include "unit/triode.h"
#include "unit/unit.h"
#include "unit/wire.h"

namespace kneeprint {

std::span<const UnitRecord> virtual_units() {
  static const std::array units{kTriodeUnit, kDiodeUnit, kPushPullUnit, kSigmoidUnit, kWireUnit};
  return units;
}

const UnitRecord& virtual_unit(std::string_view id) {
  std::string known;
  for (const UnitRecord& unit : virtual_units()) {
    if (unit.id == id) return unit;
    known += (known.empty() ? "" : ", ") + std::string(unit.id);
  }
  throw UsageError(fmt::format("there is no virtual unit '{}'; there are {}", id, known));
}

}  // namespace kneeprint
