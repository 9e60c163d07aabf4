// SPDX-License-Identifier: GPL-3.0-or-later
// What every steady method does with its lines: amplitude over the rig floor and the noise, with
// its uncertainty; settling; clipping.
#pragma once

#include <span>
#include <vector>

#include "method/block_spectra.h"
#include "method/settling.h"

namespace kneeprint {

inline constexpr double kDbPerRelative = 8.685889638065036;  // 20 / ln 10
/// Lines from here up are not claimed (share of the sample rate).
inline constexpr double kHighestShare = 0.45;
/// Two-tone methods put tones up to 20 kHz and products just above: what a converter's own filter
/// passes in the usual half-band design, 20 kHz at 44.1 kHz, can be read.
inline constexpr double kConverterShare = 20000.0 / 44100.0;
inline constexpr Hertz kBandLow{20.0};
inline constexpr Hertz kBandHigh{20000.0};

/// An amplitude relative to a reference amplitude.
struct RelativeReading {
  double ratio = 0.0;  ///< the value, or the upper limit under `noise`
  double u = 0.0;      ///< standard uncertainty of the ratio, noise and floor combined
  double dof = kInfiniteDof;
  Flag flag = Flag::none;  ///< none, floor, noise
  double common_u = 0.0;   ///< the part of u that all ratios of a take share: they err together
};

/// The amplitude of a line, or of several taken together, as far as noise lets it be known.
struct Amplitude {
  double value = 0.0;  ///< what noise adds taken off
  double u = 0.0;      ///< standard uncertainty, type A
  double dof = kInfiniteDof;
  bool in_noise = false;
  double limit = 0.0;  ///< 95 % upper limit, where it is in the noise
};

/// `read` as it stands in the spectrum, noise of `u` per component in it.
Amplitude amplitude_of(double read, double u, double dof);

/// An amplitude over the reference line; `floor` is the rig's own share as a ratio (0: unknown).
/// The floor is a type B term of known amplitude and unknown phase, u = floor / sqrt 2.
RelativeReading relate(const Amplitude& amplitude, const Line& reference, double floor);
/// The same for amplitude_of(amplitude, u, dof).
RelativeReading relate(double amplitude, double u, double dof, const Line& reference, double floor);
/// `r` with a relative uncertainty, type B, that all ratios of the take share.
RelativeReading with_common(const RelativeReading& r, double relative_u);

/// Can other lines be referred to this tone? Its mean over `blocks` must be five times its
/// uncertainty, and its phase known in every block: 2.5 times the noise there (of which alone the
/// mean amplitude is 1.25 times, Rayleigh).
bool serves_as_reference(const Line& tone, int blocks);

/// Root sum of squares: each part's own errors by JCGM 100:2008 eq. 10, u = sqrt(sum (r u)^2) / D,
/// those they share by eq. 16 with correlation 1, sum (r u) / D. Parts under the noise stay out of
/// the value and widen the uncertainty: between none of them and all of them at their limits lies a
/// rectangular distribution. All under the noise: the root sum of their limits, flagged noise; all
/// at the floor: flagged so. No part: ratio 0.
RelativeReading root_sum_of(std::span<const RelativeReading> parts);

/// Does any sample reach the converter's end? |x| >= 0.9999 of full scale.
bool reaches_full_scale(const Waveform& take, const HoldLayout& hold);

/// Settling judged on the lines `bins`, those at least 20 dB above the noise.
Settled judge_settling(const BlockSpectra& spectra, std::span<const std::size_t> bins,
                       const TakeSettings& settings, Seconds block);

/// The blocks that are averaged at least, and those that a first attempt plays: one more, for
/// settling.
int kept_blocks(const TakeSettings& settings, Seconds block);

/// The gravest doubt of several: clipped, unsteady, alias, noise, floor, none.
Flag gravest(std::span<const Flag> flags);

}  // namespace kneeprint
