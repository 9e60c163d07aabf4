// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/format.h>

#include <cmath>
#include <iostream>
#include <nlohmann/json.hpp>

#include "cli/commands.h"
#include "cli/rig_options.h"
#include "cli/terminal_progress.h"
#include "platform/os.h"
#include "quantity/failure.h"
#include "rig/virtual_port.h"
#include "run/loop.h"

namespace kneeprint::cli {
namespace {

constexpr double kPadTolerance = 1.0;  // dB between a pad as declared and as heard

struct Options {
  RigOptions rig;
  std::string into;
  std::vector<double> frequencies{41.0, 997.0, 4990.0};
  double pad_db = 0.0, integration_s = 10.0;
  std::uint64_t seed = 1;
  bool armed = false, json = false;
};

// The loop's rig: a file that is there already is gone on with, so that pads add to one another.
OpenRig open_loop(const Options& o) {
  RigOptions options = o.rig;
  const bool exists = std::filesystem::exists(o.into);
  const bool named = !options.device.empty() || options.rig != RigOptions{}.rig;
  if (exists && !named) {
    const Rig rig = read_rig(o.into);
    options.rig = rig.kind == RigKind::virtual_rig ? rig.device : o.into;
  }
  OpenRig open;
  if (options.device.empty() && options.rig.starts_with("virtual:")) {
    // A cable stands where the unit would.
    const Hertz rate(options.rate > 0.0 ? options.rate : 48000.0);
    const auto cable = parse_virtual_rig(fmt::format("wire:pad_db={}", o.pad_db));
    open.rig = virtual_rig(cable, rate);
    open.rig.device = "virtual:wire";
    open.port = make_virtual_port(cable, rate, o.seed);
  } else {
    open = open_rig(options, o.armed, o.seed, 2);
  }
  if (exists) {
    const Rig earlier = read_rig(o.into);
    if (earlier.device != open.rig.device || earlier.rate != open.rig.rate) {
      throw InputError(fmt::format(
          "{}: holds the calibration of \"{}\" at {:g} Hz, this rig is \"{}\" at {:g} Hz; name "
          "another file",
          o.into, earlier.device, earlier.rate.value(), open.rig.device, open.rig.rate.value()));
    }
    open.rig = earlier;
  }
  return open;
}

// The gain of the loop without a pad, from an earlier run.
std::optional<Decibels> cable_gain(const Rig& rig) {
  std::optional<Decibels> highest;
  for (const FloorPoint& p : rig.floor.points()) {
    const Decibels gain = p.return_level() - p.level;
    if (!highest || gain > *highest) highest = gain;
  }
  return highest;
}

void run(const Options& o) {
  OpenRig open = open_loop(o);
  const std::optional<Decibels> cable = cable_gain(open.rig);
  if (o.pad_db > 0.0 && !cable) {
    throw UsageError("--pad: run once with a plain cable first; a pad is told apart from that");
  }
  LoopRequest request;
  request.frequencies.clear();
  for (const double f : o.frequencies) request.frequencies.emplace_back(f);
  request.integration = Seconds(o.integration_s);
  request.orders = 10;
  request.products = true;
  request.response = o.pad_db == 0.0;
  double ceiling = open.rig.ceiling_dbfs.value_or(0.0);
  if (open.rig.kind == RigKind::live && !open.rig.ceiling_dbfs) ceiling = -20.0;
  request.ceiling = LevelDbfs(o.rig.ceiling_dbfs.value_or(ceiling));

  TerminalProgress progress;
  os::catch_interrupts();
  const LoopResult loop = measure_loop(*open.port, request, progress);
  if (o.pad_db > 0.0) {
    const double heard = (*cable - loop.gain).value();
    if (std::abs(heard - o.pad_db) > kPadTolerance) {
      throw InputError(fmt::format(
          "the pad was declared as {:g} dB, but the return came back {:.2f} dB lower than by the "
          "cable; check the pad and the input gain",
          o.pad_db, heard));
    }
  }
  add_loop(open.rig, loop);
  open.rig.calibrated_on = os::utc_now().substr(0, 10);
  os::write_whole(o.into, rig_json(open.rig));
  progress.clear_line();
  if (o.json) {
    std::cout << nlohmann::ordered_json{{"rig", o.into},
                                        {"loop_gain_db", loop.gain.value()},
                                        {"floor_points", open.rig.floor.points().size()},
                                        {"response_points", open.rig.response.points().size()}}
                     .dump()
              << "\n";
    return;
  }
  std::cout << fmt::format(
      "{}: the loop returns {:+.2f} dB (converter levels); floor of {} lines, levels and "
      "frequencies, response at {} frequencies\n",
      o.into, loop.gain.value(), open.rig.floor.points().size(), open.rig.response.points().size());
}

}  // namespace

void add_calibrate(CLI::App& app, ExitCode&) {
  auto* command = app.add_subcommand(
      "calibrate",
      "with a cable in place of the unit: what the rig itself adds, and its response, into a rig "
      "file");
  auto o = std::make_shared<Options>();
  command->add_option("--into", o->into, "the rig file; one that is there is gone on with")
      ->required();
  add_rig_options(*command, o->rig);
  command->add_option("--pad", o->pad_db, "attenuation in the loop, dB, as declared by its maker")
      ->check(CLI::Range(0.0, 120.0));
  command
      ->add_option("--frequencies", o->frequencies,
                   "tones whose harmonics are read, Hz (41 997 4990)")
      ->check(CLI::Range(10.0, 40000.0));
  command->add_option("--integration", o->integration_s, "seconds of each take (10)")
      ->check(CLI::Range(1.0, 120.0));
  command->add_option("--seed", o->seed, "seed of a virtual rig")->capture_default_str();
  command->add_flag("--armed", o->armed, "let a live rig play");
  command->add_flag("--json", o->json, "print the result as JSON");
  command->callback([o] { run(*o); });
}

}  // namespace kneeprint::cli
