// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/window.h"

#include <doctest/doctest.h>

#include <cmath>
#include <complex>
#include <numbers>
#include <set>
#include <stdexcept>
#include <string>

namespace kneeprint {
namespace {

struct Figures {
  const char* id;
  double noise_bandwidth, sidelobe_db, scallop_db;
};

// The closed transform of the published coefficients at 40 digits. They round to what Harris
// (1978), Albrecht (2001) and Heinzel, Ruediger & Schilling (2002) print.
constexpr Figures kFigures[] = {
    {"hann", 1.5000000, -31.47, -1.42362},       {"blackman-harris-4", 2.0043529, -92.01, -0.82557},
    {"nuttall-4c", 1.9761093, -98.17, -0.85056}, {"albrecht-7", 2.6302513, -180.47, -0.48523},
    {"hft144d", 4.5386048, -144.05, -0.00213},   {"hft248d", 5.6512438, -248.39, -0.00088},
};

// |W(bins)| / W(0) of the samples themselves.
double slow_response(const std::vector<double>& samples, double bins) {
  std::complex<double> sum = 0.0;
  double dc = 0.0;
  for (std::size_t n = 0; n < samples.size(); ++n) {
    sum += samples[n] * std::polar(1.0, -2.0 * std::numbers::pi * bins * static_cast<double>(n) /
                                            static_cast<double>(samples.size()));
    dc += samples[n];
  }
  return std::abs(sum) / dc;
}

}  // namespace

TEST_CASE("every window has its published figures of merit") {
  CHECK(windows().size() == std::size(kFigures));
  for (const Figures& f : kFigures) {
    CAPTURE(f.id);
    const Window& w = window(f.id);
    // Half a digit of the table, which is finer than the prints.
    CHECK(std::abs(noise_bandwidth_bins(w) - f.noise_bandwidth) < 1e-7);
    CHECK(std::abs(scallop_db(w) - f.scallop_db) < 1e-5);
    CHECK(std::abs(highest_sidelobe_db(w) - f.sidelobe_db) < 0.01);
  }
}

TEST_CASE("the samples have the noise bandwidth and the response of the closed form") {
  for (const Window& w : windows()) {
    CAPTURE(std::string(w.id));
    const std::vector<double> samples = sample(w, 4096);
    double sum = 0.0, squares = 0.0;
    for (const double x : samples) {
      sum += x;
      squares += x * x;
    }
    CHECK(sum / 4096.0 == doctest::Approx(w.coefficients[0]).epsilon(1e-13));
    CHECK(4096.0 * squares / (sum * sum) ==
          doctest::Approx(noise_bandwidth_bins(w)).epsilon(1e-12));
    for (const double bins : {0.0, 0.1, 0.5, 1.0, 1.7, 2.0, 3.3}) {
      CAPTURE(bins);
      // At 4096 samples the closed form, of unlimited samples, differs by its own aliases: 1e-7.
      CHECK(std::abs(relative_response(w, bins) - slow_response(samples, bins)) < 1e-6);
    }
    CHECK(relative_response(w, -1.7) == relative_response(w, 1.7));
    // Beyond the last shifted cosine every whole bin is a null; near one the form stays smooth.
    const auto null = static_cast<double>(w.coefficients.size());
    CHECK(relative_response(w, null) == 0.0);
    CHECK(relative_response(w, 1.0 + 1e-8) ==
          doctest::Approx(relative_response(w, 1.0)).epsilon(1e-7));
  }
}

TEST_CASE("the periodic form: symmetric about N/2, and two halves of a Hann window add up to one") {
  const std::vector<double> hann = sample(window("hann"), 10);
  CHECK(hann[0] == doctest::Approx(0.0));
  CHECK(hann[5] == doctest::Approx(1.0));
  for (std::size_t n = 1; n < 10; ++n) CHECK(hann[n] == doctest::Approx(hann[10 - n]));
  for (std::size_t n = 0; n < 5; ++n) CHECK(hann[n] + hann[n + 5] == doctest::Approx(1.0));
}

TEST_CASE("ids are unique, every window names its source, and an unknown id is refused") {
  std::set<std::string_view> ids;
  for (const Window& w : windows()) {
    ids.insert(w.id);
    CHECK(w.source.find("19") + w.source.find("20") != 2 * std::string_view::npos);
    CHECK(&window(w.id) == &w);
  }
  CHECK(ids.size() == windows().size());
  CHECK_THROWS_AS(window("boxcar-9"), std::out_of_range);
}

}  // namespace kneeprint
