// SPDX-License-Identifier: GPL-3.0-or-later
// A way to the converters. Virtual, PortAudio: both pull their samples from a Player, so from the
// guard.
#pragma once

#include <memory>
#include <string>

#include "rig/player.h"

namespace kneeprint {

struct PortInfo {
  std::string name;  ///< for the page: device and host API, or the virtual unit
  Hertz rate{48000.0};
  bool live = false;  ///< sounds in the room
  bool has_reference = false;
  std::size_t buffer_frames = 0;
  Seconds reported_latency{0.0};  ///< round trip that the driver claims
};

class Port {
 public:
  virtual ~Port() = default;
  virtual const PortInfo& info() const = 0;
  /// Runs the player to its end. `take` numbers the take (seeds a virtual rig's noise, so a resumed
  /// run repeats bit for bit). Throws DeviceError when the device fails; says what to check.
  virtual void play(Player& player, int take) = 0;
};

}  // namespace kneeprint
