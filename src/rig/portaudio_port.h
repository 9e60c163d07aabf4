// SPDX-License-Identifier: GPL-3.0-or-later
// Live converters by PortAudio: full duplex on one device, any host API. The only file pair that
// sees PortAudio. What drivers print while they are probed is swallowed.
#pragma once

#include <memory>
#include <string>
#include <vector>

#include "rig/port.h"

namespace kneeprint {

struct DeviceInfo {
  int index = 0;  ///< as --device takes it
  std::string name, host_api;
  int inputs = 0, outputs = 0;
  Hertz default_rate{48000.0};
};

std::vector<DeviceInfo> list_devices();

struct LiveSettings {
  std::string device;  ///< index, or text that stands in exactly one device's name (any case)
  int send_channel = 1, return_channel = 1;  ///< from 1
  int reference_channel = 0;                 ///< 0: none
  Hertz rate{0.0};                           ///< 0: the device's default rate; 8 kHz .. 192 kHz
};

/// Opens the device and runs it, silent between takes, until the port goes. Throws UsageError when
/// reference and return are one input; DeviceError: no such device, several match, too few
/// channels, rate refused (names what is there), or no callback within 5 s. Port::play throws
/// DeviceError when the device stops or stalls for 5 s; the port is then lost for good.
std::unique_ptr<Port> make_portaudio_port(const LiveSettings& settings);

}  // namespace kneeprint
