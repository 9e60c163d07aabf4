// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/multitone_design.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <complex>
#include <cstdlib>
#include <map>
#include <numbers>
#include <set>

using namespace kneeprint;

namespace {

std::vector<long> bins() {
  std::vector<long> out;
  for (const MultitoneTone& t : multitone_tones()) out.push_back(static_cast<long>(t.cycles));
  return out;
}

double largest(const std::vector<double>& x) {
  double most = 0.0;
  for (const double v : x) most = std::max(most, std::abs(v));
  return most;
}

}  // namespace

TEST_CASE("odd, a third of an octave apart, up to 0.45 of 44.1 kHz, clear of the mains") {
  const std::vector<long> tones = bins();
  REQUIRE(tones.size() == 31);
  CHECK(tones.front() >= 20);
  CHECK(tones.back() <= 19845);
  for (std::size_t i = 0; i < tones.size(); ++i) {
    CAPTURE(tones[i]);
    CHECK(tones[i] % 2 == 1);
    for (const long mains : {50L, 60L}) CHECK(tones[i] % mains != 0);
    // Within a third of a step of the exact place: the grid is coarse at the low end.
    const double exact = 20.0 * std::pow(19845.0 / 20.0, static_cast<double>(i) / 30.0);
    CHECK(std::abs(std::log(static_cast<double>(tones[i]) / exact)) <
          std::log(19845.0 / 20.0) / 30.0 / 3.0);
  }
}

TEST_CASE("no tone on a product of two others up to order 3") {
  const std::vector<long> tones = bins();
  const std::set<long> own(tones.begin(), tones.end());
  for (const long a : tones) {
    CHECK_FALSE(own.contains(2 * a));
    CHECK_FALSE(own.contains(3 * a));
    for (const long b : tones) {
      if (a == b) continue;
      CAPTURE(a);
      CAPTURE(b);
      CHECK_FALSE(own.contains(a + b));
      CHECK_FALSE(own.contains(std::abs(a - b)));
      CHECK_FALSE(own.contains(2 * a + b));
      CHECK_FALSE(own.contains(std::abs(2 * a - b)));
    }
  }
}

TEST_CASE("products of three others meet tones in 12 foursomes, as the header says") {
  const std::vector<long> tones = bins();
  const std::set<long> own(tones.begin(), tones.end());
  int met = 0;
  for (std::size_t i = 0; i < tones.size(); ++i) {
    for (std::size_t j = i + 1; j < tones.size(); ++j) {
      for (std::size_t k = j + 1; k < tones.size(); ++k) {
        const long a = tones[i], b = tones[j], c = tones[k];
        for (const long f : {a + b + c, a + b - c, a - b + c, -a + b + c}) {
          if (own.contains(std::abs(f))) ++met;
        }
      }
    }
  }
  // In each of them, a + b = c + d or a + b + c = d, every tone falls on a product of the others.
  CHECK(met == 4 * 12);
}

TEST_CASE("the crest factor is 3.074, its peak at the block's first sample at every rate") {
  const std::vector<double> fine = multitone_period(std::size_t{1} << 20);
  CHECK(largest(fine) == doctest::Approx(1.0).epsilon(1e-9));
  double squares = 0.0;
  for (const double v : fine) squares += v * v;
  CHECK(1.0 / std::sqrt(squares / static_cast<double>(fine.size())) ==
        doctest::Approx(multitone_crest()).epsilon(1e-9));
  CHECK(multitone_crest() == doctest::Approx(3.074).epsilon(1e-4));
  for (const double rate : {44100.0, 48000.0, 96000.0}) {
    const std::vector<double> x = multitone_period(multitone_block(Hertz(rate)));
    CHECK(x.size() == static_cast<std::size_t>(rate));
    CHECK(x.front() == doctest::Approx(1.0).epsilon(1e-12));
    CHECK(largest(x) <= 1.0 + 1e-12);
    // Odd tones only: the second half repeats the first, inverted.
    for (std::size_t n = 0; n < x.size() / 2; n += 997) {
      CHECK(std::abs(x[n] + x[n + x.size() / 2]) < 1e-12);
    }
  }
}

TEST_CASE("lines of the square, from the list of tones") {
  // x = A sum cos(w t + p): x^2 has A^2 cos of every sum and difference, A^2 / 2 of every octave.
  double sum = 0.0;
  for (const MultitoneTone& t : multitone_tones()) sum += std::cos(t.phase);
  const double a = 1.0 / sum;
  std::map<std::size_t, std::complex<double>> lines;
  const auto& tones = multitone_tones();
  for (std::size_t i = 0; i < tones.size(); ++i) {
    lines[2 * tones[i].cycles] += std::polar(a * a / 2.0, 2.0 * tones[i].phase);
    for (std::size_t j = 0; j < i; ++j) {
      lines[tones[i].cycles + tones[j].cycles] +=
          std::polar(a * a, tones[i].phase + tones[j].phase);
      lines[tones[i].cycles - tones[j].cycles] +=
          std::polar(a * a, tones[i].phase - tones[j].phase);
    }
  }
  // Over the tones' rms, for a second harmonic of 1, which is a2 / 2 at peak 1.
  const double rms = a * std::sqrt(31.0 / 2.0);
  const std::vector<double>& second = multitone_products().second;
  REQUIRE(second.size() == 20001);
  for (std::size_t k = 1; k < second.size(); ++k) {
    const auto found = lines.find(k);
    const double expected =
        found == lines.end() ? 0.0 : 2.0 * std::abs(found->second) / std::numbers::sqrt2 / rms;
    REQUIRE(std::abs(second[k] - expected) < 1e-12);
  }
}

TEST_CASE("the cube stands on odd bins, none of them a tone") {
  const std::vector<double>& third = multitone_products().third;
  for (std::size_t k = 0; k < third.size(); k += 2) REQUIRE(third[k] < 1e-12);
  for (const long k : bins()) CHECK(third[static_cast<std::size_t>(k)] == 0.0);
  // One line by hand: 3 * 19845 is out of reach, 3 * 6283 = 18849 holds A^3 / 4 of that tone and
  // whatever a + b +- c falls there; the whole is checked by its sum. x^3 of a Gaussian of rms s
  // has 6 s^6 outside its own line (Hermite); 31 tones and the band's edge leave less.
  double sum = 0.0;
  for (const double v : third) sum += v * v;
  const double gaussian = 16.0 * 6.0 / std::pow(multitone_crest(), 4);
  CHECK(sum < gaussian);
  CHECK(sum > 0.5 * gaussian);
}
