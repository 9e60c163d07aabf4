// SPDX-License-Identifier: GPL-3.0-or-later
// A recorder's own time, followed by the tones it carries. Tape runs too fast, too slow and
// unevenly; a steady tone says so at every moment. The response is read again at the moments at
// which the stimulus' samples stand in it, before harmonics and products are taken.
//
//   y(m - e(m)) = s(m),   s: the stimulus' lines with their amplitudes as they come back
//
// e is a quintic spline with a knot every 16 ms (for tones below 47 Hz every 3/4 of a period),
// fitted by least squares to all samples of the hold at once, through the slope of the whole
// periodic response (Gauss and Newton's method; for white noise the maximum likelihood estimate of
// e). It passes changes of up to 10 Hz within 0.01 % of their excursion and ends at 31 Hz.
#pragma once

#include <optional>
#include <span>
#include <vector>

#include "method/block_spectra.h"

namespace kneeprint {

/// How a recorder ran while one take passed.
struct RecorderTime {
  bool drifts = false;   ///< significantly (F test at 0.1 %), by more than 0.001 sample
  double speed = 0.0;    ///< mean relative error of the speed, positive when fast
  double flutter = 0.0;  ///< peak deviation of the relative speed between 0.5 and 10 Hz
  /// rms error that the time still has: the tracker's own noise, and what the tone's sidebands show
  /// beyond noise and amplitude modulation. Without significant drift: what was not taken out.
  Seconds jitter{0.0};

  /// Relative loss of a line at `f` by the jitter: 1 - exp(-x^2 / 2), x = 2 pi f jitter (mean of
  /// exp(j x) for Gaussian x; the carrier of a phase-modulated tone). Not corrected: a standard
  /// uncertainty of this size is stated instead.
  double loss(Hertz f) const;
  /// The line at `f` with that term in its uncertainty.
  Line with_loss(const Line& line, Hertz f) const;
};

/// A take whose recorder's time was followed.
struct SteadiedTake {
  RecorderTime time;
  /// In the stimulus' time within the hold and 5 ms around it, elsewhere as it came. Empty without
  /// significant drift: then the response stands, bit for bit.
  std::optional<Waveform> take;
  /// Bins of a block on either side of a line in which phase noise was taken for flutter and
  /// removed: they tell too little noise. 0 where nothing was taken out.
  std::size_t emptied = 0;

  const Waveform& or_else(const Waveform& response) const { return take ? *take : response; }
};

/// `hold`: where the response is steady, and 10 ms before and after it. `tones`: cycles per block
/// of the stimulus' tones; the one that tells time best leads, the harmonics of one (to 20),
/// the products of two (to order 5) follow. Excursions of up to 8 ms are followed. Never throws for
/// bad data: with no tone, or one too weak to tell, the response stands.
SteadiedTake steady_time(const Waveform& response, const HoldLayout& hold,
                         std::span<const std::size_t> tones);

/// The one or two steady tones of a stimulus, in cycles per block; none where it has no two equal
/// blocks, or other lines above a hundredth of the strongest.
std::vector<std::size_t> steady_tones(const Stimulus& stimulus);

/// What methods call: steady_time where the rig's clock drifts, else the response as it is.
SteadiedTake in_stimulus_time(const Waveform& response, const HoldLayout& hold,
                              std::span<const std::size_t> tones, const RigView& rig);

}  // namespace kneeprint
