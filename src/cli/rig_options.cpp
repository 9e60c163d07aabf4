// SPDX-License-Identifier: GPL-3.0-or-later
#include "cli/rig_options.h"

#include <fmt/format.h>

#include <string_view>

#include "quantity/failure.h"
#include "rig/portaudio_port.h"
#include "rig/virtual_port.h"
#include "run/loop.h"

namespace kneeprint::cli {
namespace {

constexpr std::string_view kVirtual = "virtual:";
constexpr Hertz kVirtualRate{48000.0};

OpenRig open_virtual(const RigOptions& options, std::uint64_t seed, int orders) {
  const VirtualRigName name = parse_virtual_rig(options.rig.substr(kVirtual.size()));
  const Hertz rate = options.rate > 0.0 ? Hertz(options.rate) : kVirtualRate;
  OpenRig open;
  open.rig = virtual_rig(name, rate);
  open.port = make_virtual_port(name, rate, seed);
  const auto cable = make_virtual_port(parse_virtual_rig("wire"), rate, seed);
  LoopRequest loop;
  loop.orders = orders;
  SilentProgress unheard;
  add_loop(open.rig, measure_loop(*cable, loop, unheard));
  return open;
}

void require_armed(bool armed) {
  if (armed) return;
  throw UsageError(
      "a live rig plays only when armed: mute or unpatch monitors and headphones, meter the unit's "
      "output for DC before you patch it, then repeat with --armed. The first tone is the chain "
      "check, "
      "at -40 dBFS or less.");
}

LiveSettings live_settings(const RigOptions& options) {
  return {options.device, options.send, options.ret, options.reference, Hertz(options.rate)};
}

OpenRig open_device(const RigOptions& options) {
  OpenRig open;
  open.port = make_portaudio_port(live_settings(options));
  open.rig.name = open.port->info().name;
  open.rig.kind = RigKind::live;
  open.rig.device = options.device;
  open.rig.send_channel = options.send;
  open.rig.return_channel = options.ret;
  if (options.reference > 0) {
    open.rig.reference_channel = options.reference;
    open.rig.reference_tap = "second-output";
  }
  open.rig.rate = open.port->info().rate;
  return open;
}

OpenRig open_file(const RigOptions& options) {
  OpenRig open;
  open.has_rig_file = true;
  open.rig = read_rig(options.rig);
  LiveSettings settings{open.rig.device, open.rig.send_channel, open.rig.return_channel,
                        open.rig.reference_channel.value_or(0), open.rig.rate};
  open.port = make_portaudio_port(settings);
  return open;
}

}  // namespace

void add_rig_options(CLI::App& command, RigOptions& options) {
  auto* rig = command.add_option("--rig", options.rig,
                                 "virtual:NAME (a virtual unit; no hardware needed) or a rig file");
  rig->capture_default_str();
  command.add_option("--device", options.device, "a live device, by text in its name or by index")
      ->excludes(rig);
  command.add_option("--send", options.send, "output channel, from 1")->check(CLI::PositiveNumber);
  command.add_option("--return", options.ret, "input channel, from 1")->check(CLI::PositiveNumber);
  command
      .add_option("--reference", options.reference,
                  "input channel patched straight from the send, from 1")
      ->check(CLI::PositiveNumber);
  command.add_option("--rate", options.rate, "sample rate, Hz")
      ->check(CLI::Range(8000.0, 192000.0));
  command
      .add_option("--ceiling", options.ceiling_dbfs,
                  "highest level that may leave, dBFS; a live device without a rig file stays at "
                  "-20 until you name another")
      ->check(CLI::Range(-120.0, 0.0));
}

OpenRig open_rig(const RigOptions& options, bool armed, std::uint64_t seed, int orders) {
  if (!options.device.empty()) {
    require_armed(armed);
    return open_device(options);
  }
  if (options.rig.starts_with(kVirtual)) return open_virtual(options, seed, orders);
  const Rig rig = read_rig(options.rig);  // a bad file is told before a missing --armed
  if (rig.kind == RigKind::virtual_rig) {
    throw UsageError(
        fmt::format("{} describes a virtual rig; name it as --rig {}", options.rig, rig.device));
  }
  require_armed(armed);
  return open_file(options);
}

}  // namespace kneeprint::cli
