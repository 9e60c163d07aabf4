// SPDX-License-Identifier: GPL-3.0-or-later
// The envelope of a reel's marks.
#pragma once

#include <algorithm>
#include <cmath>
#include <numbers>

#include "quantity/quantity.h"

namespace kneeprint {

/// 0 outside 0 .. length, 1 within, raised-cosine over `edge` at both ends.
inline double raised_edge(Seconds time, Seconds length, Seconds edge) {
  const double inside = std::min(time, length - time) / edge;
  if (inside <= 0.0) return 0.0;
  return inside >= 1.0 ? 1.0 : 0.5 - 0.5 * std::cos(std::numbers::pi * inside);
}

}  // namespace kneeprint
