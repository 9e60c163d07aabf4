// SPDX-License-Identifier: GPL-3.0-or-later
#include <iostream>

#include "cli/commands.h"
#include "cli/result_text.h"
#include "cli/terminal_progress.h"
#include "run/dim_run.h"
#include "run/reel_run.h"

namespace kneeprint::cli {
namespace {

struct Options {
  std::string folder, recording;
  int channel = 1, dim = 0;
  bool takes_only = false, json = false;
};

void run(const Options& o) {
  TerminalProgress progress;
  if (o.dim != 0) {
    ingest_dim(o.folder, o.recording, o.channel, o.dim == 30 ? DimKind::dim30 : DimKind::dim100,
               progress);
  } else {
    ingest_reel(o.folder, o.recording, o.channel, progress);
  }
  if (o.takes_only) return;
  const Published published = publish_folder(o.folder, progress);
  progress.clear_line();
  std::cout << result_text(o.folder, published, {}, o.json);
}

}  // namespace

void add_ingest(CLI::App& app, ExitCode&) {
  auto* command = app.add_subcommand("ingest", "read the recording of a reel");
  auto o = std::make_shared<Options>();
  command->add_option("folder", o->folder, "the folder that `kneeprint reel` wrote")->required();
  command->add_option("recording", o->recording, "WAV, FLAC, AIFF: what the unit gave")->required();
  command->add_option("--channel", o->channel, "channel of the recording, from 1")
      ->check(CLI::PositiveNumber);
  command
      ->add_option("--dim", o->dim,
                   "the recording is no reel but an external generator's DIM signal through the "
                   "unit: 30 or 100")
      ->check(CLI::IsMember({30, 100}));
  command->add_flag("--takes-only", o->takes_only, "keep the takes; no curves, fit or report");
  command->add_flag("--json", o->json, "print the result as JSON");
  command->callback([o] { run(*o); });
}

}  // namespace kneeprint::cli
