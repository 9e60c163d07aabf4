// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/plan_code.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <random>
#include <stdexcept>

namespace kneeprint {

TEST_CASE("every digit in every place comes back, at low and high rates") {
  for (const Hertz rate : {Hertz(8000.0), Hertz(44100.0), Hertz(192000.0)}) {
    CAPTURE(rate.value());
    for (std::uint32_t digit = 0; digit < 16; ++digit) {
      const std::uint32_t code = 0x11111111u * digit ^ 0x01234567u;
      const std::vector<double> sound = plan_code_sound(code, rate);
      CHECK(sound.size() == plan_code_length(rate));
      CHECK(*std::ranges::max_element(sound) <= 1.0);
      CHECK(read_plan_code(sound, rate) == code);
    }
  }
}

TEST_CASE("inversion, clipping, rectification, filters, noise and a few milliseconds do no harm") {
  const Hertz rate(48000.0);
  const std::uint32_t code = 0x9f08e7d6;
  const std::vector<double> sound = plan_code_sound(code, rate);
  std::vector<double> worn = sound;
  SUBCASE("inverted and clipped to a square") {
    for (double& x : worn) x = std::clamp(-1000.0 * x, -0.1, 0.1);
  }
  SUBCASE("rectified") {
    for (double& x : worn) x = std::max(x, 0.0);
  }
  SUBCASE("through one pole at 300 Hz") {
    double y = 0.0;
    for (double& x : worn) x = y += 0.0385 * (x - y);
  }
  SUBCASE("in noise of its own level") {
    std::mt19937 random(9);
    std::normal_distribution<double> normal(0.0, 0.7);
    for (double& x : worn) x += normal(random);
  }
  SUBCASE("4 ms early and 4 ms late") {
    std::ranges::rotate(worn, worn.begin() + 192);
    CHECK(read_plan_code(worn, rate) == code);
    std::ranges::rotate(worn, worn.end() - 384);
  }
  CHECK(read_plan_code(worn, rate) == code);
}

TEST_CASE("silence and a missing burst read as nothing, and a short piece is refused") {
  const Hertz rate(48000.0);
  std::vector<double> sound = plan_code_sound(0x12345678, rate);
  std::fill_n(sound.begin() + 3 * 1920, 1920, 0.0);
  CHECK(!read_plan_code(sound, rate));
  CHECK(!read_plan_code(std::vector<double>(sound.size(), 0.0), rate));
  sound.pop_back();
  CHECK_THROWS_AS(read_plan_code(sound, rate), std::invalid_argument);
}

}  // namespace kneeprint
