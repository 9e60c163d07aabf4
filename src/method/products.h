// SPDX-License-Identifier: GPL-3.0-or-later
// The products of two tones by their numbers: which there are, what they are called.
#pragma once

#include <compare>
#include <string>
#include <vector>

namespace kneeprint {

/// The component at k1 f1 + k2 f2. (k1, k2) and (-k1, -k2) are the same one.
struct ProductIndex {
  int k1 = 0, k2 = 0;

  int order() const;  ///< |k1| + |k2|
  friend auto operator<=>(const ProductIndex&, const ProductIndex&) = default;
};

/// Products of orders 1 .. highest by rising order, the tones themselves first; of both signs the
/// one at a positive frequency for tones f1 < f2 of these cycles in a common block (at 0: the one
/// with k1 > 0).
std::vector<ProductIndex> products_to_order(int highest, std::size_t cycles1, std::size_t cycles2);

/// "f2-f1", "2f1-f2", "f1+f2", "3f1".
std::string name_of(ProductIndex p);

/// Amplitude of a product over the amplitude that harmonic n = |k1| + |k2| would have with one sine
/// of the same peak, for a curve weakly bent by a_n x^n, both relative to that peak: C(n, |k1|)
/// s1^|k1| s2^|k2| with the tones' shares s1 + s2 = 1 of the peak. (Expansion of (U1 cos a + U2 cos
/// b)^n: the product has a_n C(n, |k1|) U1^|k1| U2^|k2| / 2^(n-1), the harmonic a_n P^n / 2^(n-1).)
/// Exact for a cubic's orders 2 and 3.
double over_harmonic(ProductIndex p, double share1, double share2);

}  // namespace kneeprint
