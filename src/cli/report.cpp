// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/format.h>

#include <iostream>

#include "cli/commands.h"
#include "run/publish.h"

namespace kneeprint::cli {

void add_report(CLI::App& app, ExitCode&) {
  auto* command =
      app.add_subcommand("report", "curves and model of a kneeprint -> report.html, report.pdf");
  auto folder = std::make_shared<std::string>();
  command->add_option("folder", *folder, "the kneeprint")->required();
  command->callback([folder] {
    report_folder(*folder);
    std::cout << fmt::format("report: {}/report.html, {}/report.pdf\n", *folder, *folder);
  });
}

}  // namespace kneeprint::cli
