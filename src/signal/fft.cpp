// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/fft.h"

#include <fftw3.h>

#include <algorithm>
#include <limits>
#include <map>
#include <memory>
#include <mutex>
#include <stdexcept>

namespace kneeprint {
namespace {

struct PlanDeleter {
  void operator()(fftw_plan_s* p) const { fftw_destroy_plan(p); }
};
using PlanPtr = std::unique_ptr<fftw_plan_s, PlanDeleter>;

fftw_complex* raw(std::complex<double>* p) { return reinterpret_cast<fftw_complex*>(p); }

// FFTW_ESTIMATE measures nothing, so the same length gives the same plan and the same bits every
// time. FFTW_UNALIGNED lets one plan serve any vector.
PlanPtr make_forward(int n) {
  std::vector<double> in(static_cast<std::size_t>(n));
  std::vector<std::complex<double>> out(in.size() / 2 + 1);
  return PlanPtr(fftw_plan_dft_r2c_1d(n, in.data(), raw(out.data()),
                                      FFTW_ESTIMATE | FFTW_UNALIGNED | FFTW_PRESERVE_INPUT));
}

PlanPtr make_inverse(int n) {
  std::vector<double> out(static_cast<std::size_t>(n));
  std::vector<std::complex<double>> in(out.size() / 2 + 1);
  return PlanPtr(
      fftw_plan_dft_c2r_1d(n, raw(in.data()), out.data(), FFTW_ESTIMATE | FFTW_UNALIGNED));
}

// The plans of one direction. Executing a plan on other arrays is thread-safe; planning is not, not
// even for two lengths at once, hence one lock for both directions.
class Plans {
 public:
  explicit Plans(PlanPtr (*make)(int)) : make_(make) {}

  fftw_plan of(std::size_t n) {
    if (n == 0) throw std::invalid_argument("a transform needs at least one sample");
    if (n > static_cast<std::size_t>(std::numeric_limits<int>::max())) {
      throw std::invalid_argument("a transform holds at most 2^31 - 1 samples");
    }
    static std::mutex planner;
    const std::scoped_lock lock(planner);
    PlanPtr& plan = plans_[n];
    if (!plan) plan = make_(static_cast<int>(n));
    return plan.get();
  }

 private:
  PlanPtr (*make_)(int);
  std::map<std::size_t, PlanPtr> plans_;
};

}  // namespace

std::vector<std::complex<double>> forward_fft(std::span<const double> x) {
  static Plans plans(make_forward);
  const fftw_plan plan = plans.of(x.size());
  std::vector<std::complex<double>> out(x.size() / 2 + 1);
  // FFTW takes a plain pointer but, with FFTW_PRESERVE_INPUT, leaves the input as it is.
  fftw_execute_dft_r2c(plan, const_cast<double*>(x.data()), raw(out.data()));
  return out;
}

std::vector<double> inverse_fft(std::span<const std::complex<double>> spectrum, std::size_t size) {
  static Plans plans(make_inverse);
  const fftw_plan plan = plans.of(size);
  if (spectrum.size() != size / 2 + 1) {
    throw std::invalid_argument("an inverse transform of N samples needs N/2 + 1 spectrum values");
  }
  std::vector<std::complex<double>> in(spectrum.begin(), spectrum.end());  // c2r destroys its input
  std::vector<double> out(size);
  fftw_execute_dft_c2r(plan, raw(in.data()), out.data());
  for (double& v : out) v /= static_cast<double>(size);
  return out;
}

std::size_t fast_length(std::size_t n) {
  std::size_t best = 1;
  while (best < n) best *= 2;
  for (std::size_t fives = 1; fives < best; fives *= 5) {
    for (std::size_t threes = fives; threes < best; threes *= 3) {
      std::size_t candidate = threes;
      while (candidate < n) candidate *= 2;
      best = std::min(best, candidate);
    }
  }
  return best;
}

}  // namespace kneeprint
