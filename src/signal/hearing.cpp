// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/hearing.h"

#include <algorithm>
#include <cmath>

namespace kneeprint {
namespace {

double kilohertz(Hertz f) { return f.value() / 1000.0; }
double power_of(double decibels) { return std::pow(10.0, decibels / 10.0); }

// Slope of a filter's flanks at 51 dB, where it is symmetric: with it the filter's equivalent
// rectangular bandwidth, 4 fc / p, is the ERB.
double symmetric_slope(Hertz centre) { return 4.0 * (centre / erb_width(centre)); }

double level_within_erb(Hertz around, std::span<const AudibleTone> tones) {
  const double half = 0.5 * erb_width(around).value();
  double sum = 0.0;
  for (const AudibleTone& t : tones) {
    if (std::abs((t.frequency - around).value()) <= half) sum += power_of(t.db_spl);
  }
  return 10.0 * std::log10(sum);
}

double weight(Hertz centre, Hertz tone, double level) {
  constexpr double kBroadening = 0.35;  // per dB, at 1 kHz
  constexpr double kSymmetricLevel = 51.0;
  double p = symmetric_slope(centre);
  if (tone < centre) {
    p *= 1.0 - kBroadening * (level - kSymmetricLevel) / symmetric_slope(Hertz(1000.0));
  }
  const double pg = p * std::abs((tone - centre) / centre);
  return (1.0 + pg) * std::exp(-pg);
}

}  // namespace

Hertz erb_width(Hertz f) { return Hertz(24.7 * (4.37 * kilohertz(f) + 1.0)); }

double erb_number(Hertz f) { return 21.4 * std::log10(4.37 * kilohertz(f) + 1.0); }

Hertz frequency_of_erb_number(double number) {
  return Hertz(1000.0 * (std::pow(10.0, number / 21.4) - 1.0) / 4.37);
}

double threshold_in_quiet(Hertz f) {
  const double k = kilohertz(f);
  return 3.64 * std::pow(k, -0.8) - 6.5 * std::exp(-0.6 * (k - 3.3) * (k - 3.3)) +
         1e-3 * k * k * k * k;
}

double excitation(Hertz centre, std::span<const AudibleTone> tones) {
  double sum = 0.0;
  for (const AudibleTone& t : tones) {
    const double level = level_within_erb(t.frequency, tones);
    sum += weight(centre, t.frequency, level) * power_of(t.db_spl);
  }
  return 10.0 * std::log10(sum);
}

double critical_band_rate(Hertz f) {
  const double k = kilohertz(f);
  return 13.0 * std::atan(0.76 * k) + 3.5 * std::atan(k * k / (7.5 * 7.5));
}

double tone_masks_noise_db(Hertz f) { return 14.5 + critical_band_rate(f); }

double masked_threshold(Hertz centre, std::span<const AudibleTone> tones) {
  return std::max(excitation(centre, tones) - tone_masks_noise_db(centre),
                  threshold_in_quiet(centre));
}

}  // namespace kneeprint
