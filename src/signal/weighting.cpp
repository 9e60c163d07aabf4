// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/weighting.h"

#include <array>
#include <cmath>

#include "signal/fft.h"

namespace kneeprint {
namespace {

using Complex = std::complex<double>;

constexpr Seconds kDecay{0.1};
constexpr double kReference = 1000.0;

struct Corners {
  double f1, f2, f3, f4;
};

// IEC 61672-1:2013 Annex E, E.2 to E.4: the C corners f1, f4 from f_r, f_L, f_H with D^2 = 1/2 at
// f_L and f_H, the A corners f2, f3 from f_A.
Corners corners() {
  const double r2 = kReference * kReference, low2 = std::pow(10.0, 3.0),
               high2 = std::pow(10.0, 7.8), a = std::pow(10.0, 2.45);
  const double d2 = std::sqrt(0.5);
  const double b =
      (r2 + low2 * high2 / r2 - d2 * (low2 + high2)) / (1.0 - d2);  // E.2, D = sqrt(1/2)
  const double c = low2 * high2;
  const double root = std::sqrt(b * b - 4.0 * c);
  const double root5 = std::sqrt(5.0);
  return {std::sqrt((-b - root) / 2.0), (3.0 - root5) / 2.0 * a, (3.0 + root5) / 2.0 * a,
          std::sqrt((-b + root) / 2.0)};
}

Complex a_network(double f) {
  static const Corners k = corners();
  const Complex s(0.0, f);  // in Hz: the factors 2 pi cancel but for the gain, set at 1 kHz
  const Complex low = s / (s + k.f1), high = k.f4 / (s + k.f4);
  return low * low * high * high * (s / (s + k.f2)) * (s / (s + k.f3));
}

Complex itu468_network(double f) {
  const double f2 = f * f;
  const double even =
      ((-4.737338981378384e-24 * f2 + 2.043828333606125e-15) * f2 - 1.363894795463638e-7) * f2 +
      1.0;
  const double odd =
      ((1.306612257412824e-19 * f2 - 2.118150887518656e-11) * f2 + 5.559488023498642e-4) * f;
  return Complex(0.0, 1.246332637532143e-4 * f) / Complex(even, odd);
}

}  // namespace

Complex flat_weighting(Hertz) { return 1.0; }

Complex a_weighting(Hertz f) {
  static const double gain = 1.0 / std::abs(a_network(kReference));
  return gain * a_network(f.value());
}

Complex itu468_weighting(Hertz f) {
  static const double gain = 1.0 / std::abs(itu468_network(kReference));
  return gain * itu468_network(f.value());
}

Waveform weighted(const Waveform& x, Weighting weighting, Hertz low, Hertz high, int oversampling) {
  const auto factor = static_cast<std::size_t>(oversampling);
  const std::size_t size = fast_length(x.samples.size() + samples_in(kDecay, x.rate));
  std::vector<double> padded = x.samples;
  padded.resize(size, 0.0);
  std::vector<Complex> spectrum = forward_fft(padded);
  const double width = x.rate.value() / static_cast<double>(size);
  for (std::size_t k = 0; k < spectrum.size(); ++k) {
    const Hertz f(static_cast<double>(k) * width);
    const bool inside = f >= low && f <= high && 2 * k < size;
    spectrum[k] *= inside ? static_cast<double>(factor) * weighting(f) : 0.0;
  }
  spectrum.resize(size * factor / 2 + 1, 0.0);
  Waveform out{x.rate * static_cast<double>(factor), inverse_fft(spectrum, size * factor)};
  out.samples.resize(x.samples.size() * factor);
  return out;
}

}  // namespace kneeprint
