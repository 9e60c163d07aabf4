// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/window.h"

#include <algorithm>
#include <array>
#include <boost/math/tools/minima.hpp>
#include <cmath>
#include <numbers>
#include <stdexcept>
#include <string>

namespace kneeprint {
namespace {

constexpr std::array kHann{0.5, 0.5};
constexpr std::array kBlackmanHarris4{0.35875, 0.48829, 0.14128, 0.01168};
constexpr std::array kNuttall4c{0.3635819, 0.4891775, 0.1365995, 0.0106411};
constexpr std::array kAlbrecht7{2.712203605850388e-1, 4.334446123274422e-1, 2.180041228929303e-1,
                                6.578534329560609e-2, 1.076186730534183e-2, 7.700127105808265e-4,
                                1.368088305992921e-5};
constexpr std::array kHft144d{1.0,        1.96760033, 1.57983607, 0.81123644,
                              0.22583558, 0.02773848, 0.00090360};
constexpr std::array kHft248d{1.0,
                              1.985844164102,
                              1.791176438506,
                              1.282075284005,
                              0.667777530266,
                              0.240160796576,
                              0.056656381764,
                              0.008134974479,
                              0.000624544650,
                              0.000019808998,
                              0.000000132974};

constexpr std::string_view kHarris = "Harris, Proc. IEEE 66(1), 1978";
constexpr std::string_view kHeinzel = "Heinzel, Ruediger & Schilling, MPI Hannover, 2002";

const std::array kWindows{
    Window{"hann", kHann, kHarris},
    Window{"blackman-harris-4", kBlackmanHarris4, kHarris},
    Window{"nuttall-4c", kNuttall4c, "Nuttall, IEEE Trans. ASSP 29(1), 1981"},
    Window{"albrecht-7", kAlbrecht7, "Albrecht, ICASSP 2001"},
    Window{"hft144d", kHft144d, kHeinzel},
    Window{"hft248d", kHft248d, kHeinzel},
};

double decibels(double ratio) { return 20.0 * std::log10(ratio); }

}  // namespace

std::span<const Window> windows() { return kWindows; }

const Window& window(std::string_view id) {
  const auto found = std::ranges::find(kWindows, id, &Window::id);
  if (found == kWindows.end()) throw std::out_of_range("no window '" + std::string(id) + "'");
  return *found;
}

std::vector<double> sample(const Window& w, std::size_t size) {
  std::vector<double> out(size);
  for (std::size_t n = 0; n < size; ++n) {
    double sign = 1.0;
    for (std::size_t k = 0; k < w.coefficients.size(); ++k, sign = -sign) {
      // k n is reduced modulo the size first: a large angle would cost digits.
      const double turns = static_cast<double>(k * n % size) / static_cast<double>(size);
      out[n] += sign * w.coefficients[k] * std::cos(2.0 * std::numbers::pi * turns);
    }
  }
  return out;
}

double noise_bandwidth_bins(const Window& w) {
  const double dc = w.coefficients[0];
  double power = dc * dc;
  for (const double a : w.coefficients.subspan(1)) power += 0.5 * a * a;
  return power / (dc * dc);
}

// The transforms of the shifted cosines added up:
// W(f) / W(0) = sin(pi f) / (pi f) * (1 + sum_k (-1)^k (a_k / a_0) f^2 / (f^2 - k^2)).
// In this form the terms cancel before the small factor, so lobes at -248 dB keep their digits.
double relative_response(const Window& w, double bins) {
  const double f = std::abs(bins);
  const double nearest = std::round(f);
  const double off = f - nearest;
  if (std::abs(off) < 1e-9) {  // at a whole bin the form above is 0/0 or 0
    const auto k = static_cast<std::size_t>(nearest);
    if (k == 0) return 1.0;
    return k < w.coefficients.size() ? 0.5 * w.coefficients[k] / w.coefficients[0] : 0.0;
  }
  double sum = 1.0, sign = -1.0;
  for (std::size_t k = 1; k < w.coefficients.size(); ++k, sign = -sign) {
    const auto shift = static_cast<double>(k);
    sum += sign * w.coefficients[k] / w.coefficients[0] * f * f / ((f - shift) * (f + shift));
  }
  const double x = std::numbers::pi * f;
  return std::abs(std::sin(std::numbers::pi * off) / x * sum);
}

double scallop_db(const Window& w) { return decibels(relative_response(w, 0.5)); }

double highest_sidelobe_db(const Window& w) {
  // Lobes lie between whole bins; those of every window here fall beyond the 60th.
  constexpr int kLastBin = 100, kPerBin = 32;
  const auto response = [&](double bins) { return -relative_response(w, bins); };
  double best = static_cast<double>(w.coefficients.size());
  for (int i = 0; i <= (kLastBin - static_cast<int>(w.coefficients.size())) * kPerBin; ++i) {
    const double bins =
        static_cast<double>(w.coefficients.size()) + static_cast<double>(i) / kPerBin;
    if (response(bins) < response(best)) best = bins;
  }
  const auto [at, negative] = boost::math::tools::brent_find_minima(response, best - 1.0 / kPerBin,
                                                                    best + 1.0 / kPerBin, 24);
  return decibels(-negative);
}

}  // namespace kneeprint
