// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/hearing.h"

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <utility>

using namespace kneeprint;

namespace {

struct Row {
  double hertz, width, number, bark;
};

// ERB = 24.7 (4.37 F + 1), ERB-number = 21.4 log10(4.37 F + 1) (Glasberg & Moore 1990); Bark after
// Zwicker & Terhardt 1980. Evaluated to the digits shown.
constexpr std::array kTable{
    Row{100.0, 35.4939, 3.36957, 0.98673},     Row{250.0, 51.6848, 6.86224, 2.44479},
    Row{500.0, 78.6695, 10.76654, 4.73647},    Row{1000.0, 132.6390, 15.62145, 8.51053},
    Row{2000.0, 240.5780, 21.15516, 13.10406}, Row{4000.0, 456.4560, 27.10742, 17.25892},
    Row{8000.0, 888.2120, 33.29454, 21.27532}, Row{16000.0, 1751.7240, 39.60645, 24.09445}};

double power_of(double db) { return std::pow(10.0, db / 10.0); }

}  // namespace

TEST_CASE("ERB widths, ERB-numbers and Bark as published") {
  for (const Row& r : kTable) {
    CAPTURE(r.hertz);
    CHECK(std::abs(erb_width(Hertz(r.hertz)).value() - r.width) < 5e-5);
    CHECK(std::abs(erb_number(Hertz(r.hertz)) - r.number) < 5e-6);
    CHECK(std::abs(critical_band_rate(Hertz(r.hertz)) - r.bark) < 5e-6);
    CHECK(frequency_of_erb_number(erb_number(Hertz(r.hertz))).value() ==
          doctest::Approx(r.hertz).epsilon(1e-12));
  }
}

TEST_CASE("threshold in quiet (Terhardt 1979)") {
  constexpr std::array<std::pair<double, double>, 7> kQuiet{{{100.0, 22.9529},
                                                             {250.0, 11.0099},
                                                             {1000.0, 3.3691},
                                                             {3300.0, -4.9809},
                                                             {5000.0, 0.4817},
                                                             {10000.0, 10.5769},
                                                             {16000.0, 65.9321}}};
  for (const auto& [hertz, db] : kQuiet) {
    CAPTURE(hertz);
    CHECK(std::abs(threshold_in_quiet(Hertz(hertz)) - db) < 5e-5);
  }
}

TEST_CASE("at 51 dB a filter's weights integrate to the ERB") {
  for (const double centre : {200.0, 1000.0, 6000.0}) {
    CAPTURE(centre);
    const double step = erb_width(Hertz(centre)).value() / 200.0;
    double sum = 0.0;
    for (double f = step; f < 2.0 * centre; f += step) {
      const std::array tone{AudibleTone{Hertz(f), 51.0}};
      sum += power_of(excitation(Hertz(centre), tone) - 51.0) * step;
    }
    // Both flanks end at one centre frequency away: what is cut off there is p exp(-p) / 2 of the
    // whole, largest at 200 Hz (p = 17.3, 3e-7); the sum over a kink-free curve adds less.
    CHECK(sum == doctest::Approx(erb_width(Hertz(centre)).value()).epsilon(1e-4));
  }
}

TEST_CASE("a tone at the centre excites by its own level; loud tones spread upwards, not down") {
  const std::array loud{AudibleTone{Hertz(1000.0), 90.0}}, soft{AudibleTone{Hertz(1000.0), 51.0}};
  CHECK(excitation(Hertz(1000.0), loud) == doctest::Approx(90.0));
  const auto relative = [](double at, const std::array<AudibleTone, 1>& t) {
    return excitation(Hertz(at), t) - t[0].db_spl;
  };
  CHECK(relative(800.0, loud) == doctest::Approx(relative(800.0, soft)));
  CHECK(relative(1500.0, loud) > relative(1500.0, soft) + 10.0);
  // By hand at 1500 Hz: p = 6000 / 186.6085 = 32.15288, lower flank at 90 dB
  // 32.15288 (1 - 0.35 * 39 / 30.15705) = 17.59957; g = 1/3: 10 log10(6.86652 exp(-5.86652)).
  CHECK(relative(1500.0, loud) ==
        doctest::Approx(10.0 * std::log10(6.86652) - 58.6652 / std::log(10.0)).epsilon(1e-5));
}

TEST_CASE("tones within an ERB broaden each other; powers add") {
  const std::array pair{AudibleTone{Hertz(1000.0), 60.0}, AudibleTone{Hertz(1000.0), 60.0}};
  const std::array one{AudibleTone{Hertz(1000.0), 60.0 + 10.0 * std::log10(2.0)}};
  for (const double at : {700.0, 1000.0, 1600.0}) {
    CHECK(excitation(Hertz(at), pair) == doctest::Approx(excitation(Hertz(at), one)));
  }
}

TEST_CASE("masked threshold: 14.5 dB plus Bark under the excitation, never under quiet") {
  const std::array tone{AudibleTone{Hertz(1000.0), 70.0}};
  CHECK(masked_threshold(Hertz(1000.0), tone) ==
        doctest::Approx(70.0 - 14.5 - 8.51053).epsilon(1e-6));
  CHECK(masked_threshold(Hertz(12000.0), tone) == threshold_in_quiet(Hertz(12000.0)));
  CHECK(masked_threshold(Hertz(1000.0), {}) == threshold_in_quiet(Hertz(1000.0)));
}
