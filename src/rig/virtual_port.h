// SPDX-License-Identifier: GPL-3.0-or-later
// The default rig: a virtual unit behind virtual converters. No audio hardware needed.
//
// send sample -> 24-bit quantiser with TPDF dither -> noise -> volts by the hidden true full scale
// -> interpolation to the oversampled rate (signal/oversample.h) -> small residual distortion ->
// unit -> residual distortion -> latency -> decimation -> volts to full scale by the hidden true
// value -> noise -> clip at full scale -> 24-bit quantiser with dither -> return sample. Streams
// buffer by buffer, as a driver would. Seeded: the same seed and take number give the same bits,
// whatever was played before. Every take starts from the unit's settled rest.
#pragma once

#include <cstdint>
#include <map>
#include <memory>
#include <string>

#include "rig/port.h"
#include "rig/rig_file.h"

namespace kneeprint {

/// Imperfections; the defaults are those of a good measuring interface.
struct ConverterModel {
  VoltsRms full_scale{12.276529880};  ///< stated: +24 dBu for a full-scale sine, both directions
  Decibels full_scale_u{0.01};  ///< standard uncertainty of that; the hidden error is drawn from it
  LevelDbfs noise{-116.0};      ///< rms of each converter, white to half the rate
  Decibels second_harmonic{-128.0};  ///< residual of each converter at full scale
  Decibels third_harmonic{-132.0};
  /// Corner of the first-order coupling of each direction; 0: passes DC.
  Hertz send_coupling{0.0}, return_coupling{0.0};
  /// Round trip, the same at every frequency; any real number above 380 (buffer and filters).
  double latency_samples = 1473.3125;
  bool dither_and_quantise = true;
  bool reference = false;  ///< second return: a split at the unit's input terminals
  bool noiseless = false;  ///< also drops gain error, residual and dither: a perfect wire
};

struct VirtualRigName {
  std::string unit;  ///< registry id
  std::map<std::string, std::string> settings;
};

/// "triode" or "sigmoid:family=atan,bias=0.2" (what follows "virtual:"). Throws UsageError.
VirtualRigName parse_virtual_rig(const std::string& text);

std::unique_ptr<Port> make_virtual_port(const VirtualRigName& name, Hertz rate, std::uint64_t seed,
                                        const ConverterModel& model = {});

/// The rig description (stated, not hidden values) that goes with it; without floor.
Rig virtual_rig(const VirtualRigName& name, Hertz rate, const ConverterModel& model = {});

}  // namespace kneeprint
