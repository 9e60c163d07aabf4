// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/loop_response.h"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace kneeprint {
namespace {

constexpr double kEven = 0.5;  // the share taken where the split is unknown

std::complex<double> phasor(double db, double degrees) {
  return std::polar(Decibels(db).ratio(), degrees * std::numbers::pi / 180.0);
}

}  // namespace

LoopResponse::LoopResponse(std::vector<LoopPoint> points, std::optional<double> return_share)
    : points_(std::move(points)), return_share_(return_share) {
  std::sort(points_.begin(), points_.end(),
            [](const LoopPoint& a, const LoopPoint& b) { return a.frequency < b.frequency; });
}

LoopPoint LoopResponse::at(Hertz f) const {
  if (points_.empty()) return {f, Decibels(0.0), 0.0};
  const auto above = std::lower_bound(points_.begin(), points_.end(), f,
                                      [](const LoopPoint& p, Hertz g) { return p.frequency < g; });
  if (above == points_.begin()) return points_.front();
  if (above == points_.end()) return points_.back();
  const LoopPoint &a = *(above - 1), &b = *above;
  const double share = std::log(f / a.frequency) / std::log(b.frequency / a.frequency);
  return {f, a.magnitude + share * (b.magnitude - a.magnitude),
          a.phase_deg + share * (b.phase_deg - a.phase_deg)};
}

LoopResponse::Share LoopResponse::share_of(const LoopPoint& p, double share) const {
  const double db = p.magnitude.value();
  return {phasor(share * db, share * p.phase_deg),
          Decibels(return_share_ ? 0.0 : kEven * std::abs(db) / std::numbers::sqrt3)};
}

std::complex<double> LoopResponse::loop(Hertz f) const {
  const LoopPoint p = at(f);
  return phasor(p.magnitude.value(), p.phase_deg);
}

LoopResponse::Share LoopResponse::ret(Hertz f) const {
  return share_of(at(f), return_share_.value_or(kEven));
}

LoopResponse::Share LoopResponse::send(Hertz f) const {
  return share_of(at(f), 1.0 - return_share_.value_or(kEven));
}

LoopResponse::Share LoopResponse::ret_ratio(Hertz f, Hertz reference) const {
  const LoopPoint a = at(f), b = at(reference);
  return share_of({f, a.magnitude - b.magnitude, a.phase_deg - b.phase_deg},
                  return_share_.value_or(kEven));
}

}  // namespace kneeprint
