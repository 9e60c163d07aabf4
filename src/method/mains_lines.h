// SPDX-License-Identifier: GPL-3.0-or-later
// Mains lines in block spectra. Blocks hold whole cycles of 50 and of 60 Hz, but the mains wanders
// by some 0.05 Hz: every line then leaks into the bins around it, and since it repeats from block
// to block almost as a product does, it would pass for one. Its phase's advance from block to block
// tells how far it is off; its leakage is then known and can be taken off.
#pragma once

#include <complex>
#include <vector>

#include "method/block_spectra.h"

namespace kneeprint {

class MainsLines {
 public:
  /// Blocks of 1 s: a bin is 1 Hz wide. Follows multiples of 50 and of 60 Hz up to kHighest.
  explicit MainsLines(const BlockSpectra& spectra);

  static constexpr std::size_t kHighest = 1000;
  static bool is_multiple(std::size_t bin) {
    return bin > 0 && bin <= kHighest && (bin % 50 == 0 || bin % 60 == 0);
  }
  /// What all lines put into a bin; 0 above kFarthest. Lines more than half a bin off (the 10th
  /// multiple of a mains 0.05 Hz off) cannot be followed and are left where they are.
  std::complex<double> leakage(int block, std::size_t bin) const;
  static constexpr std::size_t kFarthest = 1300;  ///< 300 Hz from any line: 56 dB under it or more

 private:
  struct Line {
    std::size_t mains = 0, bin = 0;
    double off = 0.0;                             // bins from `bin`
    std::complex<double> numerator;               // of the window's response `off` bins away
    std::vector<std::complex<double>> amplitude;  // peak, by block

    std::complex<double> gain() const { return off == 0.0 ? 1.0 : numerator / off; }
  };
  void follow(const BlockSpectra& spectra, std::size_t mains);
  double advance_per_order(const BlockSpectra& spectra, std::size_t mains) const;
  void refine(const BlockSpectra& spectra);
  /// What a bin holds less what all lines but its own leak there.
  std::complex<double> own(const BlockSpectra& spectra, int block, std::size_t bin) const;

  std::complex<double> tail_;  // j pi over the samples of a block
  std::vector<Line> lines_;
};

}  // namespace kneeprint
