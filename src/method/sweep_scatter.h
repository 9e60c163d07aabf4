// SPDX-License-Identifier: GPL-3.0-or-later
// What the repeats of a sweep tell of noise and of drift, without a transform per repeat: the
// differences between repeats are demodulated along the sweep, at its orders and halfway between
// them. Halfway stands noise alone; what the orders show above that is the unit's own change.
#pragma once

#include <span>
#include <vector>

#include "method/method.h"
#include "quantity/uncertain.h"
#include "signal/log_sweep.h"

namespace kneeprint {

class SweepScatter {
 public:
  /// Orders 1 .. `orders` at fundamentals from `lowest` on, where the order's frequency stays below
  /// `highest`. `hold` has two blocks or more. Judges whether the repeats agree in their
  /// fundamental, within the noise or within `wanted`; the first, which begins from rest, is left
  /// out when that alone makes the others agree.
  SweepScatter(const LogSweep& sweep, const Waveform& take, const HoldLayout& hold, int orders,
               Hertz lowest, Hertz highest, Decibels wanted);

  bool settled() const { return settled_; }
  int first() const { return first_; }  ///< repeats from here on are averaged

  /// Standard uncertainty of each component of order n's response at `f`, as a peak sample value,
  /// when the mean of the repeats is read through a window of that energy. The noise halfway (at
  /// this and the neighbouring quarter octaves) and the order's own scatter are pooled, unless an F
  /// test at 0.1 % says that the order scatters more; then its own scatter alone.
  Contribution u(int order, Hertz f, Seconds window_energy) const;

 private:
  // |amplitude|^2 of a difference: per contrast, of half order k at [k - 1].
  using Powers = std::vector<std::vector<double>>;
  struct Node {
    Powers powers;
    double fundamental = 0.0;         // |amplitude|^2 of the repeats' mean
    double equivalent_samples = 0.0;  // (sum v)^2 / (sum v^2) of the node's window v
  };
  Node demodulate(Hertz f, const Waveform& take, const HoldLayout& hold, int orders) const;
  bool agree(int contrast, Decibels wanted) const;

  LogSweep sweep_;
  Hertz rate_, lowest_, highest_;
  int blocks_;
  int first_ = 0;
  bool settled_ = true;
  std::vector<Node> nodes_;
  std::vector<double> critical_;  // of the F test, by the number of values halfway
};

}  // namespace kneeprint
