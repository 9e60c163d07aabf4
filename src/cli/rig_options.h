// SPDX-License-Identifier: GPL-3.0-or-later
// The RIG options that several commands share, and the port that they open.
#pragma once

#include <CLI/CLI.hpp>
#include <memory>
#include <optional>
#include <string>

#include "rig/port.h"
#include "rig/rig_file.h"

namespace kneeprint::cli {

struct RigOptions {
  std::string rig = "virtual:triode";
  std::string device;
  int send = 1, ret = 1, reference = 0;
  double rate = 0.0;
  std::optional<double> ceiling_dbfs;
};

void add_rig_options(CLI::App& command, RigOptions& options);

struct OpenRig {
  Rig rig;
  std::unique_ptr<Port> port;
  bool has_rig_file = false;
};

/// Opens what the options name. A live rig is refused without `armed` (UsageError), with what
/// arming means. `orders`: how many orders a virtual rig's floor is measured to.
OpenRig open_rig(const RigOptions& options, bool armed, std::uint64_t seed, int orders);

}  // namespace kneeprint::cli
