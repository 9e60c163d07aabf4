// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/format.h>

#include <iostream>
#include <nlohmann/json.hpp>

#include "cli/commands.h"
#include "rig/portaudio_port.h"
#include "unit/unit.h"

namespace kneeprint::cli {

void add_devices(CLI::App& app, ExitCode&) {
  auto* command = app.add_subcommand("devices", "list live audio devices and virtual units");
  auto json = std::make_shared<bool>(false);
  command->add_flag("--json", *json, "print JSON");
  command->callback([json] {
    const auto devices = list_devices();
    if (*json) {
      nlohmann::ordered_json out;
      out["devices"] = nlohmann::ordered_json::array();
      for (const DeviceInfo& d : devices) {
        out["devices"].push_back({{"index", d.index},
                                  {"name", d.name},
                                  {"host_api", d.host_api},
                                  {"inputs", d.inputs},
                                  {"outputs", d.outputs},
                                  {"default_rate_hz", d.default_rate.value()}});
      }
      out["virtual_units"] = nlohmann::ordered_json::array();
      for (const UnitRecord& u : virtual_units()) out["virtual_units"].push_back(std::string(u.id));
      std::cout << out.dump(2) << '\n';
      return;
    }
    if (devices.empty()) std::cout << "no live audio device\n";
    for (const DeviceInfo& d : devices) {
      std::cout << fmt::format("{:>3}  {} ({}): {} in, {} out, {:g} Hz\n", d.index, d.name,
                               d.host_api, d.inputs, d.outputs, d.default_rate.value());
    }
    for (const UnitRecord& u : virtual_units()) {
      std::cout << fmt::format("     virtual:{}  {}\n", u.id, u.title);
    }
  });
}

}  // namespace kneeprint::cli
