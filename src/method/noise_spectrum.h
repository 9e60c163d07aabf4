// SPDX-License-Identifier: GPL-3.0-or-later
// Spectral density of noise with lines in it.
#pragma once

#include <complex>
#include <vector>

#include "signal/waveform.h"

namespace kneeprint {

/// Averaged spectrum by Hann windows that overlap by half (Welch, IEEE Trans. AU-15(2) 1967).
class NoiseSpectrum {
 public:
  /// Segments of `segment` length, as many as fit; at least one must.
  NoiseSpectrum(const Waveform& x, Seconds segment);

  double bin_hz() const { return bin_hz_; }
  std::size_t bins() const { return density_.size(); }
  int segments() const { return static_cast<int>(spectra_.size()); }
  /// One-sided mean square per hertz, mean over the segments.
  double density(std::size_t bin) const { return density_[bin]; }
  /// The same of one segment.
  double density(int segment, std::size_t bin) const;
  /// Spectrum of one segment, in arbitrary but common units: for phases and ratios.
  std::complex<double> at(int segment, std::size_t bin) const {
    return spectra_[static_cast<std::size_t>(segment)][bin];
  }
  /// Independent segments' worth of the averaged power: neighbours share (1/6)^2 of their noise
  /// (Welch 1967).
  double effective_segments() const;

  /// Density of the noise under the lines around `bin`: median over the bins `nearest` ..
  /// `farthest` away on both sides, made unbiased for Gaussian noise; robust against lines.
  struct Level {
    double density = 0.0;
    double dof = 0.0;
  };
  Level around(std::size_t bin, std::size_t nearest, std::size_t farthest) const;

 private:
  double bin_hz_ = 0.0;
  double scale_ = 0.0;
  std::vector<std::vector<std::complex<double>>> spectra_;
  std::vector<double> density_;
};

}  // namespace kneeprint
