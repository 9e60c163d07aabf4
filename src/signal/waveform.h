// SPDX-License-Identifier: GPL-3.0-or-later
// A mono signal in memory. Full scale is +-1 where it stands for converter codes.
#pragma once

#include <cstddef>
#include <vector>

#include "quantity/quantity.h"

namespace kneeprint {

struct Waveform {
  Hertz rate{48000.0};
  std::vector<double> samples;

  Seconds duration() const { return Seconds(static_cast<double>(samples.size()) / rate.value()); }
};

/// Number of samples nearest to `t` at `rate`.
inline std::size_t samples_in(Seconds t, Hertz rate) {
  return static_cast<std::size_t>(t.value() * rate.value() + 0.5);
}

}  // namespace kneeprint
