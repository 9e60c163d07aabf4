// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/multitone_design.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>
#include <span>

#include "signal/fft.h"

namespace kneeprint {
namespace {

constexpr std::array<MultitoneTone, kMultitoneTones> kTones{{
    {21, -2.350795},    {25, -1.723102},  {31, 0.262423},    {39, 1.253298},     {51, 0.283294},
    {65, 1.781581},     {85, -0.909843},  {97, 0.522616},    {121, -1.506472},   {165, -0.265803},
    {205, -0.324236},   {253, -1.446169}, {319, 2.247109},   {417, -0.857218},   {511, 1.872826},
    {655, 0.591507},    {793, 0.756673},  {1003, 0.446543},  {1269, -0.285903},  {1581, -2.121069},
    {1987, 0.021912},   {2505, 0.189610}, {3149, 2.656988},  {3971, 2.784096},   {4991, 0.050332},
    {6283, -0.403471},  {7909, 0.857514}, {9953, -1.558635}, {12529, -0.611750}, {15769, 1.379691},
    {19845, -0.260666},
}};

constexpr std::size_t kHighestBin = 20000;

// Crests coincide at the block's start and nowhere higher, so the peak is a plain sum.
double peak_of_unit_tones() {
  double sum = 0.0;
  for (const MultitoneTone& t : kTones) sum += std::cos(t.phase);
  return sum;
}

// Magnitudes of the lines of x^power up to 20 kHz, as rms, times `scale`.
std::vector<double> lines_of_power(std::span<const double> x, int power, double scale) {
  std::vector<double> y(x.size());
  std::transform(x.begin(), x.end(), y.begin(), [&](double v) { return std::pow(v, power); });
  const auto spectrum = forward_fft(y);
  std::vector<double> lines(kHighestBin + 1);
  for (std::size_t k = 1; k < lines.size(); ++k) {
    lines[k] = scale * std::abs(spectrum[k]) * std::numbers::sqrt2 / static_cast<double>(x.size());
  }
  for (const MultitoneTone& t : kTones) lines[t.cycles] = 0.0;
  return lines;
}

MultitoneProducts find_products() {
  constexpr std::size_t kGrid = std::size_t{1} << 17;  // holds 3 * 19845 Hz unfolded
  const std::vector<double> x = multitone_period(kGrid);
  const double crest = multitone_crest();  // peak 1 over rms
  return {lines_of_power(x, 2, 2.0 * crest), lines_of_power(x, 3, 4.0 * crest)};
}

}  // namespace

const std::array<MultitoneTone, kMultitoneTones>& multitone_tones() { return kTones; }

double multitone_crest() {
  return peak_of_unit_tones() / std::sqrt(static_cast<double>(kMultitoneTones) / 2.0);
}

std::size_t multitone_block(Hertz rate) {
  return 2 * static_cast<std::size_t>(std::llround(rate.value() / 2.0));
}

std::vector<double> multitone_period(std::size_t samples) {
  const double peak = 0.5 * static_cast<double>(samples) / peak_of_unit_tones();
  std::vector<std::complex<double>> spectrum(samples / 2 + 1);
  for (const MultitoneTone& t : kTones) {
    if (2 * t.cycles < samples) spectrum[t.cycles] = std::polar(peak, t.phase);
  }
  return inverse_fft(spectrum, samples);
}

const MultitoneProducts& multitone_products() {
  static const MultitoneProducts products = find_products();
  return products;
}

}  // namespace kneeprint
