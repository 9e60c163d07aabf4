// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/oversample.h"

#include <doctest/doctest.h>

#include <cmath>
#include <complex>
#include <initializer_list>
#include <numbers>
#include <stdexcept>
#include <vector>

using kneeprint::Decimator;
using kneeprint::Interpolator;

namespace {

// Impulse response at the higher rate, gain 1 at dc.
std::vector<double> response(Interpolator filter) {
  const auto factor = static_cast<std::size_t>(filter.factor());
  std::vector<double> in(2 * filter.delay() / factor + 4, 0.0), out(in.size() * factor);
  in[0] = 1.0 / static_cast<double>(factor);
  filter.process(in, out);
  return out;
}

// An impulse at each phase r of a frame gives every factor-th sample of the response. A frame's
// later samples count for its output, which stands at the first: the response begins before 0, and
// is given here one frame late.
std::vector<double> response(const Decimator& filter) {
  const auto factor = static_cast<std::size_t>(filter.factor());
  const std::size_t frames = 2 * filter.delay() / factor + 4;
  std::vector<double> h((frames + 1) * factor, 0.0);
  for (std::size_t r = 0; r < factor; ++r) {
    Decimator fresh(filter.factor());
    std::vector<double> in(frames * factor, 0.0), out(frames);
    in[r] = 1.0;
    fresh.process(in, out);
    for (std::size_t n = 0; n < frames; ++n) {
      h[(n + 1) * factor - r] = out[n];
    }
  }
  return h;
}

// |H| at `frequency` (fraction of the lower rate), about the delay, where it must be real.
std::complex<double> transfer(const std::vector<double>& h, std::size_t delay, double frequency,
                              int factor) {
  std::complex<double> sum = 0.0;
  const double step = -2.0 * std::numbers::pi * frequency / factor;
  for (std::size_t n = 0; n < h.size(); ++n) {
    if (h[n] != 0.0) sum += h[n] * std::polar(1.0, step * (static_cast<double>(n) - delay));
  }
  return sum;
}

// The figures that the header promises, at a grid finer than the ripple of the longest stage.
void check_figures(const std::vector<double>& h, std::size_t delay, int factor) {
  double worst_pass_db = 0.0, worst_stop = 0.0, worst_phase = 0.0;
  for (double f = 0.0; f <= 0.4535; f += 0.4535 / 400) {
    const auto value = transfer(h, delay, f, factor);
    worst_pass_db = std::max(worst_pass_db, std::fabs(20.0 * std::log10(value.real())));
    worst_phase = std::max(worst_phase, std::fabs(value.imag()));
  }
  for (double f = 0.5465; f <= 0.5 * factor; f += 0.0031) {
    worst_stop = std::max(worst_stop, std::abs(transfer(h, delay, f, factor)));
  }
  CAPTURE(factor);
  CHECK(worst_pass_db < 1e-5);
  CHECK(20.0 * std::log10(worst_stop) < -140.0);
  CHECK(worst_phase < 1e-12);  // the delay is the same at every frequency; rounding remains
}

}  // namespace

TEST_CASE("interpolator and decimator keep pass-band, stop-band and delay") {
  for (const int factor : {2, 4, 16, 64}) {
    check_figures(response(Interpolator(factor)), Interpolator(factor).delay(), factor);
    check_figures(response(Decimator(factor)),
                  Decimator(factor).delay() + static_cast<std::size_t>(factor), factor);
  }
}

TEST_CASE("midpoint weights keep a constant, and the flat ones a polynomial") {
  for (const int lower : {1, 2, 4, 8, 16, 32, 64}) {
    double sum = 0.0;
    for (const double w : kneeprint::halfband_midpoint_weights(lower)) sum += 2.0 * w;
    CHECK(sum == doctest::Approx(1.0).epsilon(1e-14));
  }
  // Three pairs and more are exact for x^4 about the midpoint: sum 2 c_k (k + 1/2)^4 = 0.
  const std::vector<double> flat = kneeprint::halfband_midpoint_weights(32);
  REQUIRE(flat.size() == 3);
  CHECK(flat[0] == doctest::Approx(150.0 / 256).epsilon(1e-15));  // Deslauriers & Dubuc, 6 points
  CHECK(flat[1] == doctest::Approx(-25.0 / 256).epsilon(1e-15));
  CHECK(flat[2] == doctest::Approx(3.0 / 256).epsilon(1e-15));
}

TEST_CASE("the result does not depend on how the signal is cut") {
  std::vector<double> x(777);
  for (std::size_t n = 0; n < x.size(); ++n)
    x[n] = std::sin(0.1 * static_cast<double>(n * n % 991));
  Interpolator whole(8), cut(8);
  std::vector<double> high(x.size() * 8), high_cut(high.size());
  whole.process(x, high);
  Decimator whole_down(8), cut_down(8);
  std::vector<double> low(x.size()), low_cut(x.size());
  whole_down.process(high, low);
  for (std::size_t at = 0, size = 1; at < x.size(); at += size, size = size % 37 + 1) {
    size = std::min(size, x.size() - at);
    cut.process(std::span(x).subspan(at, size), std::span(high_cut).subspan(8 * at, 8 * size));
    cut_down.process(std::span(high_cut).subspan(8 * at, 8 * size),
                     std::span(low_cut).subspan(at, size));
  }
  CHECK(high == high_cut);
  CHECK(low == low_cut);
}

TEST_CASE("factor 1 copies; other factors than powers of two and wrong sizes are refused") {
  Interpolator copy(1);
  const std::vector<double> x{1.0, -2.0, 3.0};
  std::vector<double> y(3);
  copy.process(x, y);
  CHECK(y == x);
  CHECK(copy.delay() == 0);
  CHECK_THROWS_AS(Interpolator(3), std::invalid_argument);
  CHECK_THROWS_AS(Decimator(0), std::invalid_argument);
  CHECK_THROWS_AS(Interpolator(2).process(x, y), std::invalid_argument);
  CHECK_THROWS_AS(Decimator(2).process(x, y), std::invalid_argument);
}
