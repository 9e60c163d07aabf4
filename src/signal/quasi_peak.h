// SPDX-License-Identifier: GPL-3.0-or-later
// The quasi-peak meter of ITU-R BS.468-4. The Recommendation names no circuit, only what the
// pointer must show for tone bursts, single and repeated. Here: a full-wave rectifier and two peak
// rectifiers after one another, each a capacitor that charges through one resistor and leaks
// through another (the usual shape, common practice). The four time constants were found by least
// squares on the Recommendation's burst tables (values and limits from memory); the tests check
// every row of them.
#pragma once

#include "quantity/quantity.h"

namespace kneeprint {

class QuasiPeakMeter {
 public:
  /// `rate`: 160 kHz and more, so that crests between samples are not missed (to 0.02 dB).
  explicit QuasiPeakMeter(Hertz rate);
  /// The pointer after one more sample: rms of the steady sine that would hold it there.
  double step(double x);

 private:
  // A capacitor, its charge and what is left of it after one sample's leak.
  struct Stage {
    double attack = 0.0, keep = 0.0, charge = 0.0;
    double step(double x);
  };
  static Stage stage(Seconds attack, Seconds decay, Hertz rate);
  Stage fast_, slow_;
};

/// Time over which the pointer forgets, seen on Gaussian noise: its autocorrelation is close to
/// exp(-t / 0.13 s) (simulated; a test checks what follows from it).
inline constexpr Seconds kQuasiPeakMemory{0.13};

}  // namespace kneeprint
