// SPDX-License-Identifier: GPL-3.0-or-later
// The colours, marker shapes and dashes of every figure, whatever paints it. The colours differ in
// lightness as well as in hue, so that they stay apart in greyscale print and for readers without
// red or green cones (tests/figure/palette_test.cpp); shape and dash vary along, so colour is never
// alone.
#pragma once

#include <array>

namespace kneeprint {

struct Colour {
  double red = 0.0, green = 0.0, blue = 0.0;  ///< sRGB, 0 .. 1
};

enum class MarkerShape { disc, square, triangle, diamond, inverted_triangle, pentagon, cross };

struct SeriesLook {
  Colour colour;
  MarkerShape marker;
  std::array<double, 4> dash;  ///< points on, off, on, off; all 0: solid
};

inline constexpr Colour rgb(int code) {
  return {((code >> 16) & 255) / 255.0, ((code >> 8) & 255) / 255.0, (code & 255) / 255.0};
}

inline constexpr Colour kPaper = rgb(0xfdfcf9), kInk = rgb(0x22262b), kSoftInk = rgb(0x5d646c),
                        kGrid = rgb(0xdedbd3), kFaintGrid = rgb(0xefede7), kShade = rgb(0xe4e1da);

inline constexpr std::array<SeriesLook, 7> kLooks{{
    {rgb(0x1b3f6b), MarkerShape::disc, {0, 0, 0, 0}},
    {rgb(0xb8501f), MarkerShape::square, {8, 3, 8, 3}},
    {rgb(0x3f9aa6), MarkerShape::triangle, {2.5, 2.5, 2.5, 2.5}},
    {rgb(0x7c2a55), MarkerShape::diamond, {10, 3, 2.5, 3}},
    {rgb(0xc99a2e), MarkerShape::inverted_triangle, {5, 2, 5, 2}},
    {rgb(0x8a8078), MarkerShape::pentagon, {1.5, 2, 1.5, 2}},
    {rgb(0x22262b), MarkerShape::cross, {12, 3, 1.5, 3}},
}};

/// Of surfaces, low to high: lightness falls evenly, so the order survives greyscale print.
inline constexpr std::array<Colour, 7> kRamp{rgb(0xf3ecdc), rgb(0xd9dfd2), rgb(0xb3cdca),
                                             rgb(0x86b3bb), rgb(0x5990a6), rgb(0x376a8c),
                                             rgb(0x1b3f6b)};

/// Any index: the table repeats.
inline const SeriesLook& look(int index) {
  const int n = static_cast<int>(kLooks.size());
  return kLooks[static_cast<std::size_t>(((index % n) + n) % n)];
}

}  // namespace kneeprint
