// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/wire.h"

#include "unit/settings.h"

namespace kneeprint {
namespace {

class Wire : public VirtualUnit {
 public:
  void process(std::span<double>) override {}
};

std::unique_ptr<VirtualUnit> make_wire(const UnitSettings& settings, Hertz) {
  SettingsReader("wire", settings).finish();
  return std::make_unique<Wire>();
}

}  // namespace

constinit const UnitRecord kWireUnit{"wire", "a cable", "Output = input.", 16, "", make_wire};

}  // namespace kneeprint
