// SPDX-License-Identifier: GPL-3.0-or-later
// Has the unit settled? An exponential is fitted over the blocks; what it has still to change,
// averaged over the blocks that would be kept, must be below the wanted uncertainty. (That two
// neighbouring blocks agree proves nothing: a time constant of 20 s passes that at once.)
#pragma once

#include <span>

#include "quantity/level.h"

namespace kneeprint {

/// One quantity over the blocks, in dB, with the standard deviation of its noise in one block.
struct BlockTrend {
  std::span<const double> decibels;
  double sigma = 0.0;
};

struct Settled {
  bool settled = false;
  int first = 0;  ///< first block to keep
};

/// The earliest first block that leaves at least `keep` blocks and satisfies every trend; when none
/// does, the last `keep` blocks. A remaining change within three of its own standard uncertainties
/// counts as none. `keep` <= number of blocks.
Settled find_settled(std::span<const BlockTrend> trends, int blocks, int keep, Seconds block,
                     Seconds longest_time_constant, Decibels wanted);

}  // namespace kneeprint
