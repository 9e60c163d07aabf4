// SPDX-License-Identifier: GPL-3.0-or-later
// What is done to the points of a whole measurement together.
#pragma once

#include <optional>

#include "curve/points.h"

namespace kneeprint {

/// Polarity of the unit at `asked_hz`: the one that its levels state, 0 when none does or they
/// disagree.
int stated_polarity(const Curves& curves, double asked_hz);

/// For an inverting unit (-1) the response is negated before phases are referred to its
/// fundamental (those of products: to both tones), which turns every even order by 180 degrees and
/// DC by its sign. +1 and 0 leave all as it is.
void make_upright(Curves& curves, int polarity);

/// A reel without declared levels: outputs (and scalars in a level unit) become dB above the
/// fundamental of the lowest usable rung at `asked_hz`, phasors are scaled so that its gain is 1.
/// Nothing usable there: all outputs are emptied.
void make_relative(Curves& curves, double asked_hz);

/// Do H2 and H3 at the same rung differ between the plan's frequencies by more than 0.5 dB and more
/// than three combined standard uncertainties? Empty when no two frequencies can be compared.
std::optional<bool> depends_on_frequency(const Curves& curves);

}  // namespace kneeprint
