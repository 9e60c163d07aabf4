// SPDX-License-Identifier: GPL-3.0-or-later
// The lines k1 f1 + k2 f2 in a take of two tones: each referred to the tones' own phases block by
// block, a recorder's drifting time and the return's share of the rig's response taken out.
#pragma once

#include <array>
#include <vector>

#include "method/block_spectra.h"
#include "method/coherent.h"
#include "method/products.h"
#include "method/reading.h"
#include "method/time_base.h"

namespace kneeprint {

class ToneLines {
 public:
  /// `rig` must outlive this.
  ToneLines(const Waveform& take, const HoldLayout& hold, const CoherentPair& tones,
            const RigView& rig);

  const BlockSpectra& spectra() const { return spectra_; }
  const CoherentPair& tones() const { return tones_; }
  Hertz frequency(ProductIndex p) const;  ///< |k1 f1 + k2 f2|
  std::size_t bin(ProductIndex p) const;
  /// Is it below the highest frequency that this rate (or the recording's) can show?
  bool in_reach(ProductIndex p) const;

  /// Mean over the blocks from `first`, as it left the unit: phases minus k1 and k2 times those of
  /// the output tones (a tone itself is real); a product at a negative frequency as it stands
  /// there. In reach only.
  Line product(ProductIndex p, int first) const;
  /// How far the unknown split of the rig's response makes the product over f2 uncertain (relative,
  /// standard).
  double split_u(ProductIndex p) const;

 private:
  const RigView& rig_;
  Hertz rate_;
  CoherentPair tones_;
  SteadiedTake steadied_;
  BlockSpectra spectra_;
  std::vector<std::array<double, 2>> turns_;  // of both tones, by block
};

}  // namespace kneeprint
