// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/resample.h"

#include <algorithm>
#include <array>
#include <boost/math/special_functions/bessel.hpp>
#include <cmath>
#include <cstddef>
#include <memory>
#include <mutex>
#include <numbers>
#include <stdexcept>

namespace kneeprint {
namespace {

// Kaiser's formulas (1974, from memory): beta = 0.1102 (A - 8.7), and a transition of
// (A - 7.95) / (2.285 * 2 * 64) radians. A = 160 dB leaves the pass-band flat up to 0.917.
constexpr double kBeta = 0.1102 * (160.0 - 8.7);
constexpr long kHalfWidth = 64;  // zero crossings on either side
// Rows of the table per sample. Cubic reading between them errs by 3/128 h^4 times the fourth
// derivative, at most pi^4 / 5: under -190 dB for each tap.
constexpr std::size_t kPhases = 256;
constexpr std::size_t kLanes = 4;  // independent sums that a compiler can put side by side

// Windowed sinc at u zero crossings from its centre.
double windowed_sinc(double u) {
  const double edge = u / static_cast<double>(kHalfWidth);
  if (std::abs(edge) >= 1.0) return 0.0;
  static const double top = boost::math::cyl_bessel_i(0, kBeta);
  const double window = boost::math::cyl_bessel_i(0, kBeta * std::sqrt(1.0 - edge * edge)) / top;
  const double x = std::numbers::pi * u;
  return window * (std::abs(x) < 1e-9 ? 1.0 : std::sin(x) / x);
}

// The kernel, one row of taps for each of kPhases positions between two samples. A row serves every
// tap at once, as neighbouring taps are one sample apart whatever the step.
class Kernel {
 public:
  // Reading slower than the signal was sampled would fold: `stretch` > 1 widens the kernel so that
  // it passes only what the new rate can hold.
  explicit Kernel(double stretch)
      : stretch_(stretch),
        reach_(static_cast<long>(std::ceil(static_cast<double>(kHalfWidth) * stretch))),
        taps_((2 * static_cast<std::size_t>(reach_) + kLanes - 1) / kLanes * kLanes),
        table_((kPhases + 3) * taps_) {
    for (std::size_t row = 0; row < kPhases + 3; ++row) {
      // One row before phase 0 and two after phase 1, for the cubic.
      const double phase = (static_cast<double>(row) - 1.0) / kPhases;
      for (std::size_t tap = 0; tap < taps_; ++tap) {
        const double from_centre = static_cast<double>(static_cast<long>(tap) - reach_ + 1) - phase;
        table_[row * taps_ + tap] = windowed_sinc(from_centre / stretch) / stretch;
      }
    }
  }

  double stretch() const { return stretch_; }

  // The signal at `whole` + `part`, 0 <= part < 1.
  double read(std::span<const double> x, long whole, double part) const {
    const double position = part * kPhases;
    const auto row = static_cast<std::size_t>(position);
    const double f = position - static_cast<double>(row);
    // Lagrange weights for four rows at -1, 0, 1, 2.
    const double w0 = -f * (f - 1.0) * (f - 2.0) / 6.0,
                 w1 = (f + 1.0) * (f - 1.0) * (f - 2.0) / 2.0,
                 w2 = -(f + 1.0) * f * (f - 2.0) / 2.0, w3 = (f + 1.0) * f * (f - 1.0) / 6.0;
    const double* const a = table_.data() + row * taps_;
    const double *const b = a + taps_, *const c = b + taps_, *const d = c + taps_;
    const auto weight = [&](std::size_t k) {
      return w0 * a[k] + w1 * b[k] + w2 * c[k] + w3 * d[k];
    };

    const long first = whole - reach_ + 1;
    const auto size = static_cast<long>(x.size()), taps = static_cast<long>(taps_);
    if (first >= 0 && first + taps <= size) {
      const double* const s = x.data() + first;
      std::array<double, kLanes> sums{};
      for (std::size_t k = 0; k < taps_; k += kLanes) {
        for (std::size_t lane = 0; lane < kLanes; ++lane) {
          sums[lane] += s[k + lane] * weight(k + lane);
        }
      }
      return (sums[0] + sums[1]) + (sums[2] + sums[3]);
    }
    double sum = 0.0;
    const long end = std::min(taps, size - first);
    for (long k = std::max(0L, -first); k < end; ++k) {
      sum += x[static_cast<std::size_t>(first + k)] * weight(static_cast<std::size_t>(k));
    }
    return sum;
  }

 private:
  double stretch_;
  long reach_;
  std::size_t taps_;
  std::vector<double> table_;
};

// The last kernel is kept: hundreds of pieces of one recording are read at one step.
std::shared_ptr<const Kernel> kernel_for(double stretch) {
  static std::mutex mutex;
  static std::shared_ptr<const Kernel> last;
  const std::scoped_lock lock(mutex);
  if (!last || last->stretch() != stretch) last = std::make_shared<Kernel>(stretch);
  return last;
}

// Positions more than the widest kernel before the signal, or beyond its end, are silent.
double read_one(const Kernel& kernel, std::span<const double> x, double position) {
  constexpr double kWidest = 8.0 * kHalfWidth;
  if (!(position >= -kWidest && position <= static_cast<double>(x.size()) + kWidest)) return 0.0;
  const double whole = std::floor(position);
  return kernel.read(x, static_cast<long>(whole), position - whole);
}

}  // namespace

std::vector<double> read_at(std::span<const double> x, double start, double step,
                            std::size_t count) {
  if (!(step > 0.0 && step <= 8.0)) throw std::invalid_argument("step must be in (0, 8]");
  if (!(std::abs(start) < 1e15)) throw std::invalid_argument("start is beyond any recording");
  const std::shared_ptr<const Kernel> kernel = kernel_for(std::max(1.0, step));
  std::vector<double> out(count);
  for (std::size_t n = 0; n < count; ++n) {
    out[n] = read_one(*kernel, x, start + static_cast<double>(n) * step);
  }
  return out;
}

std::vector<double> read_at(std::span<const double> x, std::span<const double> positions) {
  const std::shared_ptr<const Kernel> kernel = kernel_for(1.0);
  std::vector<double> out(positions.size());
  std::ranges::transform(positions, out.begin(),
                         [&](double position) { return read_one(*kernel, x, position); });
  return out;
}

}  // namespace kneeprint
