// SPDX-License-Identifier: GPL-3.0-or-later
// Streaming interpolation and decimation by powers of two, as cascades of linear-phase half-band
// filters; every second tap of those is zero and is never multiplied.
//
// For each direction alone, whatever the factor (fractions of the lower rate):
//   pass-band to 0.4535, flat within 1e-5 dB; images and aliases from 0.5465 on under -140 dB.
// The first stage next to the lower rate does the steep part (Kaiser window: Kaiser, "Nonrecursive
// digital filter design using the I0-sinh window function", ISCAS 1974, from memory). Later stages
// have room, so each takes the shorter of a Kaiser and a maximally flat half-band (midpoint
// Lagrange weights: Deslauriers & Dubuc, Constr. Approx. 5, 1989, from memory).
//
// Blocks may have any length and change from call to call; the result does not depend on how a
// signal is cut. Both start from silence. Factor 1 copies.
#pragma once

#include <cstddef>
#include <span>
#include <vector>

namespace kneeprint {

class Interpolator {
 public:
  /// `factor`: power of two, 1 .. 4096; anything else throws std::invalid_argument.
  explicit Interpolator(int factor);

  int factor() const { return factor_; }
  /// Group delay at every frequency, in samples of the higher rate.
  std::size_t delay() const { return delay_; }
  /// out.size() must be in.size() * factor(). Gain 1. No overlap of `in` and `out`.
  void process(std::span<const double> in, std::span<double> out);

 private:
  struct Stage {
    std::vector<double> half;   ///< midpoint weights from the centre outwards
    std::vector<double> input;  ///< history, then the block
    std::vector<double> middle;
  };
  int factor_;
  std::size_t delay_ = 0;
  std::vector<Stage> stages_;
};

class Decimator {
 public:
  explicit Decimator(int factor);

  int factor() const { return factor_; }
  /// Group delay at every frequency, in samples of the higher rate; a multiple of factor().
  std::size_t delay() const { return delay_; }
  /// in.size() must be out.size() * factor(); out[n] stands at the time of in[n * factor()].
  void process(std::span<const double> in, std::span<double> out);

 private:
  struct Stage {
    std::vector<double> half;
    std::vector<double> even, odd;  ///< history, then the block
    std::vector<double> middle;
  };
  int factor_;
  std::size_t delay_ = 0;
  std::vector<Stage> stages_;  ///< from the higher rate to the lower
};

/// Weights c_0, c_1, ... of the half-band between `lower` and 2 * `lower` times the base rate:
/// the value midway between x[0] and x[1] is sum_k c_k (x[-k] + x[1+k]). `lower`: 1, 2, 4, ...
std::vector<double> halfband_midpoint_weights(int lower);

}  // namespace kneeprint
