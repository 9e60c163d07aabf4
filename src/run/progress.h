// SPDX-License-Identifier: GPL-3.0-or-later
// What a run tells while it goes on. The command line and the desk each show it their own way.
#pragma once

#include <string>

#include "quantity/quantity.h"

namespace kneeprint {

struct ProgressStep {
  int take = 0, takes = 0;  ///< this one, of so many that the ladder may need
  std::string what;         ///< "steady 997 Hz"
  std::string drive;        ///< "-12.0 dBu"
  Seconds left{0.0};        ///< of sound, until the top of the ladder
};

class Progress {
 public:
  virtual ~Progress() = default;
  virtual void step(const ProgressStep& step) = 0;
  virtual void say(const std::string& sentence) = 0;
};

/// For what nobody waits for.
class SilentProgress : public Progress {
 public:
  void step(const ProgressStep&) override {}
  void say(const std::string&) override {}
};

}  // namespace kneeprint
