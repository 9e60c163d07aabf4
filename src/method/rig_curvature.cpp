// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/rig_curvature.h"

#include <cmath>
#include <numbers>

#include "signal/fft.h"

namespace kneeprint {

std::vector<double> curvature_floor(std::span<const std::complex<double>> harmonics, double second,
                                    double third) {
  // The cube of orders up to N reaches 3 N: 8 (N + 1) points per period keep it free of aliases.
  const std::size_t size = 8 * harmonics.size();
  std::vector<double> square(size), cube(size);
  std::vector<std::complex<double>> circle(size);
  for (std::size_t k = 0; k < size; ++k) {
    circle[k] = std::polar(
        1.0, 2.0 * std::numbers::pi * static_cast<double>(k) / static_cast<double>(size));
  }
  for (std::size_t k = 0; k < size; ++k) {
    double y = harmonics[0].real();
    for (std::size_t n = 1; n < harmonics.size(); ++n) {
      const std::complex<double>& turn = circle[n * k % size];
      y += harmonics[n].real() * turn.real() - harmonics[n].imag() * turn.imag();
    }
    square[k] = y * y;
    cube[k] = y * y * y;
  }
  const auto squared = forward_fft(square), cubed = forward_fft(cube);
  std::vector<double> floor(harmonics.size());
  for (std::size_t n = 0; n < floor.size(); ++n) {
    const double scale = (n == 0 ? 1.0 : 2.0) / static_cast<double>(size);
    floor[n] = scale * (2.0 * second * std::abs(squared[n]) + 4.0 * third * std::abs(cubed[n]));
  }
  return floor;
}

}  // namespace kneeprint
