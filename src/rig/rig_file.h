// SPDX-License-Identifier: GPL-3.0-or-later
// The rig: what is known about converters, cables and levels, as rig.json.
#pragma once

#include <filesystem>
#include <optional>
#include <string>

#include "curve/floor.h"
#include "curve/level_scale.h"
#include "curve/loop_response.h"

namespace kneeprint {

enum class RigKind { virtual_rig, live, reel };

struct Rig {
  std::string name;  ///< for the page
  RigKind kind = RigKind::live;
  std::string device;    ///< live: text that picks the device; virtual: "virtual:..."
  int send_channel = 1;  ///< from 1
  int return_channel = 1;
  std::optional<int> reference_channel;
  std::string reference_tap;  ///< "terminals" (a split at the unit's input) or "second-output"
  Hertz rate{48000.0};
  std::optional<Hertz> recorded_rate;  ///< a reel's recording, when it was made at another rate
  std::optional<int> marker_polarity;  ///< of a recording whose time is uneven: +1 or -1
  LevelScale send_scale;               ///< uncalibrated when the file states no full-scale voltage
  LevelScale return_scale;
  bool dc_coupled_send = false;
  bool dc_coupled_return = false;  ///< false: dc stays empty
  std::string wiring;              ///< "balanced", "pin 3 grounded", "pin 3 open", "unbalanced"
  std::optional<Ohms> source_impedance;
  std::optional<Ohms> load_impedance;
  std::optional<double> ceiling_dbfs;  ///< the guard's, when the rig file names one
  RigFloor floor;
  LoopResponse response;
  std::string calibrated_on;  ///< ISO date, or empty
  bool invented = false;      ///< virtual rigs: every page says so
};

/// JSON text. Round-trips through parse_rig.
std::string rig_json(const Rig& rig);
/// Throws InputError naming `origin` (the file), field, expected and found.
Rig parse_rig(const std::string& json, const std::string& origin);
Rig read_rig(const std::filesystem::path& file);

}  // namespace kneeprint
