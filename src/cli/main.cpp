// SPDX-License-Identifier: GPL-3.0-or-later
#include <exception>
#include <iostream>

#include "cli/commands.h"

int main(int argc, char** argv) {
  using namespace kneeprint;
  ExitCode code = ExitCode::done;
  CLI::App app{
      "Kneeprint drives audio gear that saturates from a whisper to its limit, states what it adds "
      "with "
      "its uncertainty, and condenses it into a sigmoid with a bias.\n"
      "Exit codes: 0 done, 2 wrong usage, 3 bad input file, 4 audio device failed, 5 the guard "
      "stopped "
      "the run, 6 nothing usable was measured."};
  app.name("kneeprint");
  app.require_subcommand(0, 1);  // none is answered below, so that an unknown word is named first
  app.set_version_flag("--version", KNEEPRINT_VERSION);
  for (const cli::AddCommand add : cli::kCommands) add(app, code);
  try {
    app.parse(argc, argv);
    if (app.get_subcommands().empty()) throw UsageError("which command? see kneeprint --help");
  } catch (const CLI::ParseError& e) {
    // CLI11 answers --help and --version through the same exception, with code 0.
    return app.exit(e) == 0 ? 0 : static_cast<int>(ExitCode::wrong_usage);
  } catch (const Failure& e) {
    std::cerr << "kneeprint: " << e.what() << '\n';
    return static_cast<int>(e.code());
  } catch (const std::exception& e) {
    std::cerr << "kneeprint: this is a fault of the program, please report it: " << e.what()
              << '\n';
    return 1;
  }
  return static_cast<int>(code);
}
