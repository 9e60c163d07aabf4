// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/fft.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <random>
#include <stdexcept>
#include <thread>

namespace kneeprint {
namespace {

std::vector<double> noise(std::size_t size, unsigned seed) {
  std::mt19937 random(seed);
  std::vector<double> x(size);
  for (double& v : x) v = static_cast<double>(random()) / std::mt19937::max() - 0.5;
  return x;
}

// The definition, term by term.
std::complex<double> slow_bin(const std::vector<double>& x, std::size_t k) {
  std::complex<double> sum = 0.0;
  for (std::size_t n = 0; n < x.size(); ++n) {
    const double turns = static_cast<double>(n * k % x.size()) / static_cast<double>(x.size());
    sum += x[n] * std::polar(1.0, -2.0 * std::numbers::pi * turns);
  }
  return sum;
}

}  // namespace

TEST_CASE("the transform is the sum that defines it, for lengths of any factors") {
  for (const std::size_t size : {1, 2, 3, 4, 7, 16, 30, 101, 360, 1009}) {
    CAPTURE(size);
    const std::vector<double> x = noise(size, 1);
    const auto spectrum = forward_fft(x);
    REQUIRE(spectrum.size() == size / 2 + 1);
    double worst = 0.0;
    for (std::size_t k = 0; k < spectrum.size(); ++k) {
      worst = std::max(worst, std::abs(spectrum[k] - slow_bin(x, k)));
    }
    CHECK(worst < 1e-12);  // rounding of 1009 terms below 1/2
  }
}

TEST_CASE("the inverse gives the signal back, and leaves the spectrum alone") {
  for (const std::size_t size : {1, 2, 5, 96, 997, 48000}) {
    CAPTURE(size);
    const std::vector<double> x = noise(size, 2);
    const auto spectrum = forward_fft(x);
    const auto copy = spectrum;
    const std::vector<double> back = inverse_fft(spectrum, size);
    CHECK(spectrum == copy);
    double worst = 0.0;
    for (std::size_t n = 0; n < size; ++n) worst = std::max(worst, std::abs(back[n] - x[n]));
    CHECK(worst < 1e-14);  // rounding, relative to values below 1/2
  }
}

TEST_CASE("the bits do not depend on where the samples and the spectrum stand in memory") {
  const std::vector<double> x = noise(480, 4);
  const auto expected = forward_fft(x);
  for (const std::size_t shift : {0, 1, 2, 3, 5}) {
    CAPTURE(shift);
    std::vector<double> moved(x.size() + shift);
    std::copy(x.begin(), x.end(), moved.begin() + static_cast<long>(shift));
    const std::span<const double> here(moved.data() + shift, x.size());
    CHECK(forward_fft(here) == expected);
    const SpectrumBuffer out = spectrum_buffer(expected.size() + shift);
    forward_fft(here, out.get() + shift);
    CHECK(std::equal(expected.begin(), expected.end(), out.get() + shift));
    CHECK(std::equal(x.begin(), x.end(), here.begin()));  // the input is left as it is
  }
}

TEST_CASE("threads that meet new lengths at once get the same bits as one alone") {
  const std::vector<std::size_t> sizes{1234, 777, 2048, 1500, 999, 1235, 778, 2049};
  std::vector<std::vector<std::complex<double>>> together(sizes.size());
  std::vector<std::thread> threads;
  for (std::size_t i = 0; i < sizes.size(); ++i) {
    threads.emplace_back([&, i] { together[i] = forward_fft(noise(sizes[i], 3)); });
  }
  for (std::thread& t : threads) t.join();
  for (std::size_t i = 0; i < sizes.size(); ++i) {
    CHECK(together[i] == forward_fft(noise(sizes[i], 3)));
  }
}

TEST_CASE("a transform of nothing and a spectrum of the wrong length are refused") {
  CHECK_THROWS_AS(forward_fft(std::vector<double>()), std::invalid_argument);
  const std::vector<std::complex<double>> five(5);
  CHECK_THROWS_AS(inverse_fft(five, 7), std::invalid_argument);
  CHECK_THROWS_AS(inverse_fft(five, 0), std::invalid_argument);
  CHECK(inverse_fft(five, 8).size() == 8);
  CHECK(inverse_fft(five, 9).size() == 9);
}

TEST_CASE("the fast length is the next one without factors above 5") {
  const auto smooth = [](std::size_t n) {
    for (const std::size_t p : {2, 3, 5}) {
      while (n % p == 0) n /= p;
    }
    return n == 1;
  };
  for (std::size_t n = 1; n <= 3000; ++n) {
    std::size_t expected = n;
    while (!smooth(expected)) ++expected;
    if (fast_length(n) != expected) {
      CAPTURE(n);
      CHECK(fast_length(n) == expected);
    }
  }
  CHECK(fast_length(1'000'001) == 1'012'500);  // 2^2 3^4 5^5
}

}  // namespace kneeprint
