// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/format.h>

#include <iostream>

#include "cli/commands.h"
#include "run/publish.h"

namespace kneeprint::cli {

void add_analyse(CLI::App& app, ExitCode&) {
  auto* command = app.add_subcommand("analyse", "takes of a kneeprint -> curves/*.csv");
  auto folder = std::make_shared<std::string>();
  command->add_option("folder", *folder, "the kneeprint")->required();
  command->callback([folder] {
    std::cout << fmt::format("{} takes read into {}/curves\n", analyse_folder(*folder), *folder);
  });
}

}  // namespace kneeprint::cli
