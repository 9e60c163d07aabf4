// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <span>

namespace kneeprint {

/// The element that would stand at index size / 2 if `values` were sorted; at least one value.
/// Rearranges them. The noise around every line is such a median: its selection has no branch to be
/// mispredicted and takes a third of std::nth_element's time.
double upper_median(std::span<double> values);

}  // namespace kneeprint
