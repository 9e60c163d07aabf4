// SPDX-License-Identifier: GPL-3.0-or-later
// Power over many bins, split by what repeats from block to block and what does not. Distortion of
// a periodic stimulus is periodic, noise is not: the mean of M blocks keeps the one and 1/M of the
// other's power; the scatter of the blocks tells how much that is (Pintelon & Schoukens, System
// Identification, 2nd ed. 2012, chapter 2, from memory). Powers are mean squares.
#pragma once

#include <complex>
#include <optional>
#include <span>

#include "quantity/uncertain.h"

namespace kneeprint {

/// Sums over bins; groups of bins whose noise differs are added after they were closed.
class PeriodicPower {
 public:
  /// A bin over `blocks` >= 2 blocks, peak amplitudes. Every sum that is added up needs the same
  /// number of blocks.
  void add(std::span<const std::complex<double>> bin);
  /// The bins added so far form a group of about equal noise.
  void close_group();
  /// This sum and another, both closed.
  PeriodicPower& operator+=(const PeriodicPower& other);

  /// Mean square of the periodic part, unbiased: may come out below 0 when there is none. Its
  /// variance, with noise v in each bin of the mean: n v^2 M / (M - 1) + 2 v D (non-central
  /// chi-square of 2 n degrees of freedom, and the noise taken off is an estimate itself).
  Uncertain periodic() const;
  /// Mean square of the noise in one block.
  Uncertain noise() const;
  /// Mean square of both.
  Uncertain total() const;
  /// Noise in one bin of the mean over blocks, as mean square (over groups: weighted by it).
  double noise_per_bin() const;
  /// Does the mean hold more than noise alone exceeds with probability `chance`? F test of the mean
  /// against the scatter.
  bool seen(double chance) const;
  /// 95 % upper limit of the periodic part: the power that would read lower than this one in 5 % of
  /// cases (normal approximation), never below what noise alone exceeds in 5 %.
  double upper_limit() const;

 private:
  double variance_without() const;  // of the periodic part when there is none
  double effective_bins() const;

  int blocks_ = 0;
  double raw_ = 0.0;            // mean square of the mean over blocks
  double noise_in_mean_ = 0.0;  // noise in it, sum of v
  double squares_ = 0.0;        // sum of v^2 over bins: n times the group's mean v squared
  double cross_ = 0.0;          // sum of 2 v D over groups
  double open_raw_ = 0.0, open_noise_ = 0.0;
  int open_bins_ = 0;
};

/// A power over a reference power, in dB; the uncertainty is the expanded one at 95 %.
struct PowerRatio {
  std::optional<double> db;
  std::optional<double> expanded_u_db;
};
/// Empty when there is no power at all. `reference` is above 0.
PowerRatio in_decibels(const Uncertain& power, const Uncertain& reference);

}  // namespace kneeprint
