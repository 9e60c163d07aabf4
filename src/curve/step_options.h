// SPDX-License-Identifier: GPL-3.0-or-later
// What a step of a plan may say beside its method and frequencies. Each method's header names the
// options that it reads; a plan that gives another one is refused.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "quantity/quantity.h"

namespace kneeprint {

struct StepOptions {
  std::vector<Hertz> tones;                ///< f1, f2 of a pair; empty: the method's own
  std::optional<double> ratio;             ///< amplitude of f1 over that of f2, 0.01 .. 100
  std::optional<Seconds> duration;         ///< of a sweep, a glide, a silence: 0.1 .. 120 s
  std::optional<double> listening_db_spl;  ///< level at which fill is judged, 20 .. 120 dB SPL

  friend bool operator==(const StepOptions&, const StepOptions&) = default;
};

/// A method as far as a plan needs to know it.
struct MethodNeeds {
  std::string id;
  bool frequencies = false;  ///< the step lists frequencies_hz
  bool tones = false;        ///< tones_hz may be given
  bool tones_required = false;
  bool ratio = false;
  bool duration = false;
  bool listening = false;
};

}  // namespace kneeprint
