// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/tone_lines.h"

#include <array>
#include <cmath>
#include <numeric>

namespace kneeprint {

ToneLines::ToneLines(const Waveform& take, const HoldLayout& hold, const CoherentPair& tones,
                     const RigView& rig)
    : rig_(rig),
      rate_(take.rate),
      tones_(tones),
      steadied_(in_stimulus_time(take, hold, std::array{tones.cycles1, tones.cycles2}, rig)),
      spectra_(steadied_.or_else(take), hold, std::gcd(tones.cycles1, tones.cycles2),
               steadied_.emptied) {
  for (int b = 0; b < spectra_.blocks(); ++b) {
    turns_.push_back(
        {std::arg(spectra_.at(b, tones.cycles1)), std::arg(spectra_.at(b, tones.cycles2))});
  }
}

Hertz ToneLines::frequency(ProductIndex p) const {
  return Hertz(std::abs(p.k1 * tones_.f1.value() + p.k2 * tones_.f2.value()));
}

std::size_t ToneLines::bin(ProductIndex p) const {
  return static_cast<std::size_t>(std::abs(p.k1 * static_cast<long>(tones_.cycles1) +
                                           p.k2 * static_cast<long>(tones_.cycles2)));
}

bool ToneLines::in_reach(ProductIndex p) const {
  constexpr double kRounding = 1.0 + 1e-9;
  return frequency(p).value() <= kConverterShare * rig_.usable_rate(rate_).value() * kRounding;
}

Line ToneLines::product(ProductIndex p, int first) const {
  // A product at a negative frequency shows as the conjugate at the positive one.
  const bool negative = p.k1 * tones_.f1.value() + p.k2 * tones_.f2.value() < 0.0;
  const double sign = negative ? -1.0 : 1.0;
  const auto turn = [&](int block) {
    const auto& [turn1, turn2] = turns_[static_cast<std::size_t>(block)];
    return sign * (p.k1 * turn1 + p.k2 * turn2);
  };
  const Line read =
      p.order() == 1 ? spectra_.tone(bin(p), first) : spectra_.mean(bin(p), first, turn);
  Line l = steadied_.time.with_loss(read, frequency(p));
  // The tones' own turns in the return are given back: their phases were taken as recorded.
  const auto own = [&](Hertz f) { return rig_.response.ret(f).response; };
  const std::complex<double> share =
      own(frequency(p)) *
      std::polar(1.0, -sign * (p.k1 * std::arg(own(tones_.f1)) + p.k2 * std::arg(own(tones_.f2))));
  l.mean /= share;
  l.u /= std::abs(share);
  if (negative) l.mean = std::conj(l.mean);
  return l;
}

double ToneLines::split_u(ProductIndex p) const {
  return rig_.response.ret_ratio(frequency(p), tones_.f2).u.value() / kDbPerRelative;
}

}  // namespace kneeprint
