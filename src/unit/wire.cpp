// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/wire.h"

#include <cmath>

#include "unit/settings.h"

namespace kneeprint {
namespace {

class Wire : public VirtualUnit {
 public:
  explicit Wire(double gain) : gain_(gain) {}
  void process(std::span<double> volts) override {
    if (gain_ == 1.0) return;
    for (double& v : volts) v *= gain_;
  }

 private:
  double gain_;
};

std::unique_ptr<VirtualUnit> make_wire(const UnitSettings& settings, Hertz) {
  SettingsReader reader("wire", settings);
  const double pad = reader.number("pad_db", 0.0, 0.0, 120.0);
  reader.finish();
  return std::make_unique<Wire>(std::pow(10.0, -pad / 20.0));
}

}  // namespace

constinit const UnitRecord kWireUnit{"wire", "a cable",  "Output = input, less pad_db.",
                                     16,     "pad_db=0", make_wire};

}  // namespace kneeprint
