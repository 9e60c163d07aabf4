// SPDX-License-Identifier: GPL-3.0-or-later
// Progress on stderr: one line that is rewritten on a terminal, plain lines in a pipe.
#pragma once

#include "run/progress.h"

namespace kneeprint::cli {

class TerminalProgress : public Progress {
 public:
  TerminalProgress();
  ~TerminalProgress() override;
  void step(const ProgressStep& step) override;
  void say(const std::string& sentence) override;
  /// Takes the line away, before a result is printed.
  void clear_line();

 private:
  bool terminal_;
  std::size_t shown_ = 0;  ///< columns of the line that stands there now
};

}  // namespace kneeprint::cli
