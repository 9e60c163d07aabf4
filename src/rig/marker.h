// SPDX-License-Identifier: GPL-3.0-or-later
// The marks at a reel's ends: a chirp that rises at the start and falls at the end, so that neither
// is taken for the other.
#pragma once

#include <span>
#include <vector>

#include "quantity/quantity.h"

namespace kneeprint {

enum class Sweep { rising, falling };

class Marker {
 public:
  static constexpr Seconds kLength{0.25};

  /// From 300 Hz to 6 kHz, or to 0.4 of `reel_rate` where that is lower.
  Marker(Sweep sweep, Hertz reel_rate);

  /// Value at a time after its start; peak 1, with raised-cosine ends, 0 outside its length.
  double at(Seconds time) const;
  Hertz highest() const { return highest_; }
  /// As it looks at `rate` samples per second.
  std::vector<double> samples(Hertz rate) const;

 private:
  Sweep sweep_;
  Hertz highest_;
};

struct MarkerFound {
  double start = 0.0;  ///< sample of the recording at which the marker starts
  double gain = 0.0;   ///< signed; negative means inverted
  double match = 0.0;  ///< normalised correlation within the marker's band, 0 .. 1
  double speed = 1.0;  ///< at which it passed, as a factor; 1 unless another is clearly likelier
  bool clear() const;  ///< it is the marker, not a chance likeness
};

/// The first clear likeness that starts in [from, to) of the recording, else the best unclear one.
/// `rate`: samples of the recording per second of the reel. DC, hum and whatever lies outside the
/// marker's band are left out of the comparison. Broadband noise of the marker's level still leaves
/// it clear; a marker stretched by 0.1 % too. Clean and unstretched it is placed to 0.01 sample.
/// `speeds`: how far from 1 its speed may be (0 .. 0.05). With some, the speed is found too, to
/// 0.01 % when clean and even; flutter of 0.2 % within the marker leaves it clear.
MarkerFound find_marker(const Marker& marker, std::span<const double> recording, Hertz rate,
                        long from, long to, double speeds = 0.0);

}  // namespace kneeprint
