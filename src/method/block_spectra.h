// SPDX-License-Identifier: GPL-3.0-or-later
// The steady part of a take as one whole-period spectrum per block, and the mean of a line over
// blocks with its type A uncertainty.
#pragma once

#include <complex>
#include <functional>

#include "method/method.h"
#include "signal/fft.h"

namespace kneeprint {

/// Mean of a spectral line over blocks.
struct Line {
  std::complex<double> mean;  ///< peak amplitude, cosine reference, after the rotation asked for
  double u = 0.0;             ///< standard uncertainty of each component of the mean
  double dof = kInfiniteDof;
};

class BlockSpectra {
 public:
  /// Every block of `hold` in `take`. `stride`: all lines that the stimulus can cause stand on
  /// multiples of so many bins; the bins between show the noise, but for `emptied` bins on either
  /// side of a line (SteadiedTake::emptied).
  BlockSpectra(const Waveform& take, const HoldLayout& hold, std::size_t stride,
               std::size_t emptied = 0);

  int blocks() const { return blocks_; }
  std::size_t bins() const { return bins_; }
  double bin_width() const { return bin_width_; }
  /// Peak amplitude and phase (cosine reference at the block's start) of a bin; bin 0 is the mean.
  std::complex<double> at(int block, std::size_t bin) const {
    return (bin == 0 ? 0.5 * scale_ : scale_) * block_start(block)[bin];
  }

  /// Mean over blocks first .. end-1 of line `bin`, block k rotated by -turn(k) radians first, so
  /// that slow phase drift (referred to the fundamental) does not blur harmonics. u: scatter of the
  /// blocks (2(M-1) dof) pooled with the noise of the bins around, unless an F test at 1 % says
  /// that the blocks scatter more than that noise; then the scatter alone.
  Line mean(std::size_t bin, int first, const std::function<double(int)>& turn) const;
  /// Mean of a tone that the other lines are referred to: of its amplitude block by block, whatever
  /// its phase does. Real; the scatter has one component, so M-1 dof. Noise makes an amplitude read
  /// high by sigma^2 / 2 A in each block (Rice 1944, large A): taken off.
  Line tone(std::size_t bin, int first) const;
  /// Per-component standard deviation of the noise around `bin` in one block (median of |Z|^2 over
  /// neighbours / ln 2, robust against mains lines) and its degrees of freedom; dof 0: no
  /// neighbours. As many neighbours on either side, so that a slope of the noise does not count:
  /// at the 6th bin of 1/f noise one side alone would halve it.
  struct Noise {
    double sigma = 0.0;
    double dof = 0.0;
  };
  Noise noise_around(std::size_t bin, int first) const;
  /// Amplitude of the hum that must be reckoned with on `bin`, where that is a multiple of 50 or 60
  /// Hz (the difference tone of 19 and 20 kHz is): rms of the multiples around it, noise taken off;
  /// 0 where they show none. Above the 50th multiple, where hardly any mains has lines (IEC
  /// 61000-4-7 ends at that order or earlier, from memory), only hum that is certain counts.
  double hum_at(std::size_t bin, int first, const Noise& noise) const;

  /// Mean square of everything from bin `low` to `high` inclusive, per block.
  double band_power(int block, std::size_t low, std::size_t high) const;

 private:
  /// Uncertainty of a mean over blocks from their own `scatter`, the noise around `bin`, and hum: a
  /// type B term of known amplitude and unknown phase, for hum that keeps its phase from block to
  /// block does not show in the scatter.
  Line pooled(std::complex<double> mean, double scatter, double scatter_dof, std::size_t bin,
              int first) const;
  const std::complex<double>* block_start(int block) const {
    return spectra_.get() + static_cast<std::size_t>(block) * bins_;
  }

  int blocks_ = 0;
  std::size_t bins_ = 0;
  SpectrumBuffer spectra_;  // block after block, as the transform leaves them
  double scale_ = 1.0;      // to peak amplitudes; half of it for bin 0
  double bin_width_ = 0.0;
  std::size_t stride_ = 1;
  std::size_t emptied_ = 0;
};

/// 95 % upper limit of an amplitude that was read as `read` under Gaussian noise of `u` per
/// component (Rice 1944): the amplitude that would read lower than this in 2.5 % of cases; never
/// below the level that noise alone exceeds in 5 %, 2.4477 u. It is the upper end of a two-sided
/// 95 % interval, as values have: were it a one-sided 5 % limit, what is stated (a value where the
/// reading is above the threshold, else a limit) would cover amplitudes just above the threshold in
/// 92 % only (Feldman & Cousins 1998, on choosing between the two after the reading).
double amplitude_upper_limit(double read, double u);
/// 2.4477 u: what noise alone exceeds in 5 % of cases (Rayleigh).
double noise_threshold(double u);
/// What noise of `u` adds to a reading taken off: sqrt(read^2 - u^2), 0 below u (Gudbjartsson &
/// Patz 1995, from memory: leaves less bias than read^2 - 2 u^2 under the root).
double without_noise(double read, double u);

}  // namespace kneeprint
