// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/format.h>

#include <iostream>

#include "cli/commands.h"
#include "method/method.h"
#include "run/reel_run.h"

namespace kneeprint::cli {
namespace {

struct Options {
  std::string into, plan = "portrait", rig, unit;
  double rate = 0.0;
};

void run(const Options& o) {
  MeasureRequest request;
  request.into = o.into;
  request.plan = load_plan(o.plan, method_needs());
  request.has_rig_file = !o.rig.empty();
  if (request.has_rig_file) request.rig = read_rig(o.rig);
  if (!request.has_rig_file) request.rig.name = "reel";
  request.rig.kind = RigKind::reel;
  if (o.rate > 0.0) request.rig.rate = Hertz(o.rate);
  request.unit = o.unit;
  check_rate(request.plan, request.rig.rate);
  const Seconds length = write_reel(request);
  std::cout << fmt::format(
      "{}/reel.wav: {:.0f} s at {:g} Hz. It holds tones up to the ladder's top: turn monitors and "
      "headphones down, keep limiters, equalisers and sample-rate conversion out of the way, "
      "record all "
      "of it from before the first chirp to after the last, then run: kneeprint ingest {} "
      "RESPONSE.wav\n",
      o.into, length.value(), request.rig.rate.value(), o.into);
}

}  // namespace

void add_reel(CLI::App& app, ExitCode&) {
  auto* command = app.add_subcommand(
      "reel", "write one WAV with every stimulus, for gear that cannot be measured live");
  auto o = std::make_shared<Options>();
  command->add_option("--into", o->into, "folder for the kneeprint")->required();
  command->add_option("--plan", o->plan, "glance, portrait, atlas, or a plan file")
      ->capture_default_str();
  command->add_option("--rig", o->rig, "a rig file that declares play and record levels");
  command->add_option("--rate", o->rate, "sample rate, Hz")->check(CLI::Range(8000.0, 192000.0));
  command->add_option("--unit", o->unit, "what is measured: maker, model, settings");
  command->callback([o] { run(*o); });
}

}  // namespace kneeprint::cli
