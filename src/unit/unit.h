// SPDX-License-Identifier: GPL-3.0-or-later
// Virtual units: physical models of saturating gear, stateful, run at an oversampled rate.
// Voltages: instantaneous volts at the unit's input and output terminals. All makers are invented.
#pragma once

#include <map>
#include <memory>
#include <span>
#include <string>
#include <string_view>

#include "quantity/quantity.h"

namespace kneeprint {

class VirtualUnit {
 public:
  virtual ~VirtualUnit() = default;
  /// Volts in, volts out, in place, sample by sample at the rate given to make(). Starts from the
  /// settled quiescent state.
  virtual void process(std::span<double> volts) = 0;
};

using UnitSettings = std::map<std::string, std::string>;

struct UnitRecord {
  std::string_view id;           ///< virtual:ID
  std::string_view title;        ///< what it stands for, e.g. "triode line stage (invented)"
  std::string_view description;  ///< circuit, device law, source
  int oversampling;  ///< at 48 kHz, power of two, so that its aliasing stays under -120 dB
  std::string_view settings_help;  ///< "family=tanh,limit=..." or ""
  /// Throws UsageError for an unknown or impossible setting, naming it and what is allowed.
  std::unique_ptr<VirtualUnit> (*make)(const UnitSettings& settings, Hertz oversampled_rate);
};

/// Every unit: wire, sigmoid, triode, diode, push-pull.
std::span<const UnitRecord> virtual_units();
/// By id; throws UsageError that names those there are.
const UnitRecord& virtual_unit(std::string_view id);

}  // namespace kneeprint
