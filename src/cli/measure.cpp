// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/measure.h"

#include <iostream>

#include "cli/commands.h"
#include "cli/result_text.h"
#include "cli/rig_options.h"
#include "cli/terminal_progress.h"
#include "method/method.h"
#include "platform/os.h"
#include "print/folder.h"

namespace kneeprint::cli {
namespace {

struct Options {
  RigOptions rig;
  std::string into, plan, unit;
  std::uint64_t seed = 1;
  bool armed = false, resume = false, takes_only = false, json = false;
};

ExitCode run(const Options& o) {
  const PrintFolder folder(o.into);
  MeasureRequest request;
  request.into = o.into;
  request.resume = o.resume;
  // A run that goes on takes the plan it was begun with, unless one is named (and then must equal
  // it).
  if (o.resume && o.plan.empty() && folder.exists()) {
    request.plan =
        parse_plan(read_text(folder.plan_file()), folder.plan_file().string(), method_needs());
  } else {
    request.plan = load_plan(o.plan.empty() ? "portrait" : o.plan, method_needs());
  }
  if (!o.resume && folder.exists()) {
    throw InputError(
        o.into +
        ": there is a measurement here already; name another folder, or go on with it by "
        "--resume");
  }
  OpenRig open = open_rig(o.rig, o.armed, o.seed, request.plan.orders);
  check_rate(request.plan, open.rig.rate);
  request.rig = open.rig;
  request.has_rig_file = open.has_rig_file;
  if (o.rig.ceiling_dbfs) request.ceiling = LevelDbfs(*o.rig.ceiling_dbfs);
  request.unit = o.unit;
  request.seed = o.seed;

  TerminalProgress progress;
  os::catch_interrupts();
  const ClimbEnd end = climb(request, *open.port, progress);
  const ExitCode code = end.by_guard ? ExitCode::guard_stopped : ExitCode::done;
  if (o.takes_only) return code;
  Published published;
  try {
    published = publish_folder(o.into, progress);
  } catch (const NothingUsable&) {
    if (end.by_guard) return code;  // its sentence has been said
    throw;
  }
  progress.clear_line();
  std::cout << result_text(o.into, published, end, o.json);
  return code;
}

}  // namespace

void add_measure(CLI::App& app, ExitCode& code) {
  auto* command = app.add_subcommand("measure", "measure a unit, fit its curve, write the report");
  auto o = std::make_shared<Options>();
  command->add_option("--into", o->into, "folder for the kneeprint")->required();
  command->add_option("--plan", o->plan, "glance, portrait (the default), atlas, or a plan file");
  add_rig_options(*command, o->rig);
  command->add_option("--unit", o->unit, "what is measured: maker, model, settings");
  command->add_option("--seed", o->seed, "seed of a virtual rig")->capture_default_str();
  command->add_flag("--armed", o->armed, "let a live rig play");
  command->add_flag("--resume", o->resume, "go on with a measurement that was cut short");
  command->add_flag("--takes-only", o->takes_only, "keep the takes; no curves, fit or report");
  command->add_flag("--json", o->json, "print the result as JSON");
  command->callback([o, &code] { code = run(*o); });
}

}  // namespace kneeprint::cli
