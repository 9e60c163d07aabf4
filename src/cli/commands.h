// SPDX-License-Identifier: GPL-3.0-or-later
// One file per command: it declares its options on a subcommand and returns what to run.
#pragma once

#include <CLI/CLI.hpp>
#include <array>

#include "quantity/failure.h"

namespace kneeprint::cli {

/// Adds the command's options to `app`, and sets its callback to store the exit code in `code`.
using AddCommand = void (*)(CLI::App& app, ExitCode& code);

void add_devices(CLI::App& app, ExitCode& code);
void add_measure(CLI::App& app, ExitCode& code);
void add_reel(CLI::App& app, ExitCode& code);
void add_ingest(CLI::App& app, ExitCode& code);
void add_analyse(CLI::App& app, ExitCode& code);
void add_fit(CLI::App& app, ExitCode& code);
void add_report(CLI::App& app, ExitCode& code);
void add_calibrate(CLI::App& app, ExitCode& code);

inline constexpr std::array<AddCommand, 8> kCommands{add_devices, add_measure,  add_reel,
                                                     add_ingest,  add_analyse,  add_fit,
                                                     add_report,  add_calibrate};

}  // namespace kneeprint::cli
