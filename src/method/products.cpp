// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/products.h"

#include <fmt/format.h>

#include <boost/math/special_functions/binomial.hpp>
#include <cmath>
#include <cstdlib>

namespace kneeprint {
namespace {

// "2f1", "f2"; "" for none.
std::string term(int k, const char* tone) {
  if (k == 0) return "";
  return k == 1 ? tone : fmt::format("{}{}", k, tone);
}

}  // namespace

int ProductIndex::order() const { return std::abs(k1) + std::abs(k2); }

std::vector<ProductIndex> products_to_order(int highest, std::size_t cycles1, std::size_t cycles2) {
  const auto cycles = [&](ProductIndex p) {
    return p.k1 * static_cast<long>(cycles1) + p.k2 * static_cast<long>(cycles2);
  };
  std::vector<ProductIndex> out;
  for (int n = 1; n <= highest; ++n) {
    for (int k1 = n; k1 > -n; --k1) {
      const int k2 = n - std::abs(k1);
      const ProductIndex p{k1, k2};
      const ProductIndex shown =
          cycles(p) < 0 || (cycles(p) == 0 && k1 < 0) ? ProductIndex{-k1, -k2} : p;
      out.push_back(shown);
    }
  }
  return out;
}

std::string name_of(ProductIndex p) {
  const std::string first = term(std::abs(p.k1), "f1"), second = term(std::abs(p.k2), "f2");
  if (p.k1 == 0 || p.k2 == 0) return first + second;
  if ((p.k1 > 0) == (p.k2 > 0)) return first + "+" + second;
  return p.k1 > 0 ? first + "-" + second : second + "-" + first;
}

double over_harmonic(ProductIndex p, double share1, double share2) {
  const auto n = static_cast<unsigned>(p.order()), k = static_cast<unsigned>(std::abs(p.k1));
  return boost::math::binomial_coefficient<double>(n, k) * std::pow(share1, std::abs(p.k1)) *
         std::pow(share2, std::abs(p.k2));
}

}  // namespace kneeprint
