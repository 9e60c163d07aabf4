// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/marker.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <functional>
#include <numbers>
#include <numeric>

#include "rig/raised_edge.h"
#include "signal/delay.h"
#include "signal/fft.h"

namespace kneeprint {
namespace {

constexpr Hertz kLowest{300.0}, kHighest{6000.0};
// With 2 * 5700 Hz * 0.25 s = 2850 degrees of freedom, noise matches with a standard deviation of
// 0.02, so a million lags of it reach 0.1; a steady tone 0.04. A unit that lets pass only the
// lowest tenth of the band still leaves 0.3.
constexpr double kClear = 0.25;
// The peak lies this close behind the first clear lag, whatever the unit smears.
constexpr Seconds kPeakWithin{0.05};
constexpr long kPiece = 1 << 19;

double energy(std::span<const double> x) {
  return std::inner_product(x.begin(), x.end(), x.begin(), 0.0);
}

// `x` without what lies outside the marker's band, with the phases as they are.
std::vector<double> in_band(std::span<const double> x, const Marker& marker, Hertz rate) {
  std::vector<double> padded(fast_length(x.size()), 0.0);
  const double mean = std::accumulate(x.begin(), x.end(), 0.0) / static_cast<double>(x.size());
  std::ranges::transform(x, padded.begin(), [mean](double v) { return v - mean; });
  auto spectrum = forward_fft(padded);
  for (std::size_t k = 0; k < spectrum.size(); ++k) {
    const Hertz f = rate * (static_cast<double>(k) / static_cast<double>(padded.size()));
    if (f < 0.9 * kLowest || f > 1.1 * marker.highest()) spectrum[k] = 0.0;
  }
  std::vector<double> out = inverse_fft(spectrum, padded.size());
  out.resize(x.size());
  return out;
}

struct Likeness {
  long lag = 0;
  double match = 0.0;
};

// The first clear match within lags 0 .. last, else the best.
Likeness look(std::span<const double> known, std::span<const double> heard, long last) {
  const std::vector<double> r = cross_correlation(known, heard, 0, last);
  std::vector<double> sums(heard.size() + 1, 0.0);
  for (std::size_t n = 0; n < heard.size(); ++n) sums[n + 1] = sums[n] + heard[n] * heard[n];
  // In digital silence a match is the rounding of louder parts: not counted.
  const double silence = 1e-12 * sums.back();
  const double known_energy = energy(known);
  Likeness best;
  for (long lag = 0; lag <= last; ++lag) {
    const auto n = static_cast<std::size_t>(lag);
    const double here = sums[std::min(n + known.size(), heard.size())] - sums[n];
    if (here <= silence) continue;
    const double match = std::abs(r[n]) / std::sqrt(here * known_energy);
    if (match > best.match) best = {lag, match};
    if (match > kClear) break;
  }
  return best;
}

// Half a step off still leaves half the likeness: by 0.2 % a marker slips against its image by
// pi * 0.004 * 22800 Hz/s * (0.125 s)^2 = 4.5 rad from its middle to its ends.
constexpr double kSpeedStep = 0.004;

// 1 first, then ever further away.
std::vector<double> speeds_within(double room) {
  std::vector<double> out{1.0};
  for (double off = kSpeedStep; off < room + 0.5 * kSpeedStep; off += kSpeedStep) {
    out.push_back(1.0 + off);
    out.push_back(1.0 - off);
  }
  return out;
}

// Another speed than 1 must be clearly likelier: a filter, too, costs likeness, and lets speeds
// nearby look a little better.
MarkerFound likeliest(const std::function<MarkerFound(double)>& at_speed,
                      const std::vector<double>& tried) {
  constexpr double kSureOfOne = 0.97, kClearlyBetter = 0.02, kFine = 0.001, kFinest = 5e-5;
  const MarkerFound at_one = at_speed(1.0);
  if (tried.size() == 1 || at_one.match > kSureOfOne) return at_one;
  const auto [slowest, fastest] = std::ranges::minmax(tried);
  MarkerFound best = at_one;
  const auto consider = [&](double speed) {
    const MarkerFound here = at_speed(speed);
    if (here.match > best.match) best = here;
  };
  for (double speed = slowest; speed <= fastest + 0.5 * kFine; speed += kFine) consider(speed);
  for (double step = 0.5 * kFine; step > kFinest; step *= 0.5) {
    const double middle = best.speed;
    consider(middle - step);
    consider(middle + step);
  }
  return best.match > at_one.match + kClearlyBetter ? best : at_one;
}

}  // namespace

Marker::Marker(Sweep sweep, Hertz reel_rate)
    : sweep_(sweep), highest_(std::min(kHighest, 0.4 * reel_rate)) {}

double Marker::at(Seconds time) const {
  // A linear sweep has a flat spectrum, so its correlation is as narrow as the band allows.
  const double t = sweep_ == Sweep::rising ? time.value() : (kLength - time).value();
  const double per_second = (highest_ - kLowest).value() / kLength.value();
  return raised_edge(time, kLength, Seconds(0.01)) *
         std::sin(2.0 * std::numbers::pi * (kLowest.value() + 0.5 * per_second * t) * t);
}

std::vector<double> Marker::samples(Hertz rate) const {
  std::vector<double> out(static_cast<std::size_t>(cycles(rate, kLength)) + 1);
  for (std::size_t n = 0; n < out.size(); ++n) out[n] = at(static_cast<double>(n) * period(rate));
  return out;
}

bool MarkerFound::clear() const { return match >= kClear; }

MarkerFound find_marker(const Marker& marker, std::span<const double> recording, Hertz rate,
                        long from, long to, double speeds) {
  const auto longest =
      static_cast<long>(std::ceil(cycles(rate, Marker::kLength) / (1.0 - std::abs(speeds)))) + 1;
  const auto end = static_cast<long>(recording.size());
  const auto near = static_cast<long>(cycles(rate, kPeakWithin));
  // What is filtered reaches further than what is compared, by as much as the filter rings.
  const auto band = [&](long first, long last) {
    first = std::max(0L, first);
    last = std::min(end, last);
    return in_band(
        recording.subspan(static_cast<std::size_t>(first), static_cast<std::size_t>(last - first)),
        marker, rate);
  };
  const std::vector<double> tried = speeds_within(speeds);
  from = std::max(0L, from);
  to = std::min(to, end - static_cast<long>(marker.samples(rate).size()) + 1);
  Likeness best;
  // In pieces, so that an hour of recording costs no more memory than a minute; every speed in one
  // piece before the next, so that the first marker is found and not a later likeness.
  for (long start = from; start < to && best.match < kClear; start += kPiece) {
    const long last = std::min(kPiece, to - start) - 1;
    const long margin = std::min(start, near);
    const std::vector<double> heard = band(start - margin, start + last + longest + near);
    for (const double speed : tried) {
      const Likeness here = look(marker.samples(rate / speed),
                                 std::span(heard).subspan(static_cast<std::size_t>(margin)), last);
      if (here.match > best.match) best = {start + here.lag, here.match};
      if (best.match >= kClear) break;
    }
  }
  MarkerFound found;
  if (best.match < kClear) {
    found.start = static_cast<double>(best.lag);
    found.match = best.match;
    return found;
  }
  const long margin = std::min(best.lag, near);
  const std::vector<double> heard = band(best.lag - margin, best.lag + longest + 2 * near);
  const auto at_speed = [&](double speed) {
    const Delay d = find_delay(marker.samples(rate / speed), heard, 0, margin + near);
    return MarkerFound{static_cast<double>(best.lag - margin) + d.samples, d.gain, d.match, speed};
  };
  return likeliest(at_speed, tried);
}

}  // namespace kneeprint
