// SPDX-License-Identifier: GPL-3.0-or-later
#include "cli/terminal_progress.h"

#include <fmt/format.h>

#include <cmath>
#include <iostream>

#include "platform/os.h"

namespace kneeprint::cli {
namespace {

std::string duration_text(Seconds t) {
  const long s = std::lround(t.value());
  return s >= 60 ? fmt::format("{} min {:02} s", s / 60, s % 60) : fmt::format("{} s", s);
}

}  // namespace

TerminalProgress::TerminalProgress() : terminal_(os::is_terminal(2)) {}

TerminalProgress::~TerminalProgress() { clear_line(); }

void TerminalProgress::clear_line() {
  if (shown_ > 0) std::cerr << '\r' << std::string(shown_, ' ') << '\r' << std::flush;
  shown_ = 0;
}

void TerminalProgress::step(const ProgressStep& step) {
  const std::string line = fmt::format("take {} of {}: {}, {}, at most {} of sound left", step.take,
                                       step.takes, step.what, step.drive, duration_text(step.left));
  if (!terminal_) {
    std::cerr << line << '\n';
    return;
  }
  clear_line();
  std::cerr << line << std::flush;
  shown_ = line.size();
}

void TerminalProgress::say(const std::string& sentence) {
  clear_line();
  std::cerr << sentence << '\n';
}

}  // namespace kneeprint::cli
