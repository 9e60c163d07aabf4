// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/palette.h"

#include <algorithm>
#include <cmath>
#include <set>

#include "doctest/doctest.h"

namespace kneeprint {
namespace {

using Matrix = std::array<std::array<double, 3>, 3>;

// Machado, Oliveira & Fernandes, IEEE TVCG 15(6) 2009, table of severity 1.0 (from memory); on
// linear RGB.
constexpr Matrix kAllCones{{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}};
constexpr Matrix kNoRedCones{{{0.152286, 1.052583, -0.204868},
                              {0.114503, 0.786281, 0.099216},
                              {-0.003882, -0.048116, 1.051998}}};
constexpr Matrix kNoGreenCones{{{0.367322, 0.860646, -0.227968},
                                {0.280085, 0.672501, 0.047413},
                                {-0.011820, 0.042940, 0.968881}}};

double linear(double v) {  // IEC 61966-2-1
  return v <= 0.04045 ? v / 12.92 : std::pow((v + 0.055) / 1.055, 2.4);
}

/// CIE L*a*b* of sRGB (white D65) as seen through `m`.
std::array<double, 3> lab(const Colour& c, const Matrix& m) {
  const double in[3] = {linear(c.red), linear(c.green), linear(c.blue)};
  double rgb_seen[3];
  for (int i = 0; i < 3; ++i) {
    const auto& row = m[static_cast<std::size_t>(i)];
    rgb_seen[i] = std::clamp(row[0] * in[0] + row[1] * in[1] + row[2] * in[2], 0.0, 1.0);
  }
  const auto [r, g, b] = rgb_seen;
  const auto f = [](double t) { return t > 0.008856 ? std::cbrt(t) : 7.787 * t + 16.0 / 116.0; };
  const double x = f((0.4124 * r + 0.3576 * g + 0.1805 * b) / 0.9505);
  const double y = f(0.2126 * r + 0.7152 * g + 0.0722 * b);
  const double z = f((0.0193 * r + 0.1192 * g + 0.9505 * b) / 1.089);
  return {116.0 * y - 16.0, 500.0 * (x - y), 200.0 * (y - z)};
}

double difference(const Colour& a, const Colour& b, const Matrix& m) {
  const auto p = lab(a, m), q = lab(b, m);
  return std::sqrt(std::pow(p[0] - q[0], 2) + std::pow(p[1] - q[1], 2) + std::pow(p[2] - q[2], 2));
}

TEST_CASE("colours stay apart from each other and from the paper, whatever cones a reader has") {
  // A difference of 2.3 is just noticeable (Mahy et al. 1994); lines and markers a few points wide
  // need several times that.
  constexpr double kApart = 12.0, kFromPaper = 30.0;
  for (const auto& cones : {kAllCones, kNoRedCones, kNoGreenCones})
    for (std::size_t i = 0; i < kLooks.size(); ++i) {
      CHECK(difference(kLooks[i].colour, kPaper, cones) > kFromPaper);
      for (std::size_t j = i + 1; j < kLooks.size(); ++j) {
        CAPTURE(i);
        CAPTURE(j);
        CHECK(difference(kLooks[i].colour, kLooks[j].colour, cones) > kApart);
      }
    }
}

TEST_CASE("shape and dash vary along, and any index has a look") {
  std::set<MarkerShape> shapes;
  std::set<std::array<double, 4>> dashes;
  for (const auto& l : kLooks) {
    shapes.insert(l.marker);
    dashes.insert(l.dash);
  }
  CHECK(shapes.size() == kLooks.size());
  CHECK(dashes.size() == kLooks.size());
  CHECK(&look(0) == &look(7));
  CHECK(&look(-1) == &look(6));
}

}  // namespace
}  // namespace kneeprint
