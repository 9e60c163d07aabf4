// SPDX-License-Identifier: GPL-3.0-or-later
#include <iostream>

#include "cli/commands.h"
#include "cli/result_text.h"
#include "run/publish.h"

namespace kneeprint::cli {

void add_fit(CLI::App& app, ExitCode&) {
  auto* command = app.add_subcommand("fit", "curves of a kneeprint -> model.json");
  auto folder = std::make_shared<std::string>();
  auto json = std::make_shared<bool>(false);
  command->add_option("folder", *folder, "the kneeprint")->required();
  command->add_flag("--json", *json, "print model.json");
  command->callback([folder, json] {
    const Model model = fit_folder(*folder);
    std::cout << (*json ? model_json(model) : fit_text(model));
  });
}

}  // namespace kneeprint::cli
