// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/fft.h"

#include <fftw3.h>

#include <algorithm>
#include <map>
#include <memory>
#include <mutex>

namespace kneeprint {
namespace {

struct PlanDeleter {
  void operator()(fftw_plan_s* p) const { fftw_destroy_plan(p); }
};
using PlanPtr = std::unique_ptr<fftw_plan_s, PlanDeleter>;

// FFTW's planner is not thread-safe; executing a plan on other arrays is.
std::mutex planner;

// FFTW_ESTIMATE measures nothing, so the same length gives the same plan and the same bits every time.
// FFTW_UNALIGNED lets one plan serve any vector.
fftw_plan forward_plan(std::size_t n) {
  static std::map<std::size_t, PlanPtr> plans;
  const std::scoped_lock lock(planner);
  PlanPtr& plan = plans[n];
  if (!plan) {
    std::vector<double> in(n);
    std::vector<std::complex<double>> out(n / 2 + 1);
    plan.reset(fftw_plan_dft_r2c_1d(static_cast<int>(n), in.data(),
                                    reinterpret_cast<fftw_complex*>(out.data()),
                                    FFTW_ESTIMATE | FFTW_UNALIGNED | FFTW_PRESERVE_INPUT));
  }
  return plan.get();
}

fftw_plan inverse_plan(std::size_t n) {
  static std::map<std::size_t, PlanPtr> plans;
  const std::scoped_lock lock(planner);
  PlanPtr& plan = plans[n];
  if (!plan) {
    std::vector<std::complex<double>> in(n / 2 + 1);
    std::vector<double> out(n);
    plan.reset(fftw_plan_dft_c2r_1d(static_cast<int>(n), reinterpret_cast<fftw_complex*>(in.data()),
                                    out.data(), FFTW_ESTIMATE | FFTW_UNALIGNED));
  }
  return plan.get();
}

}  // namespace

std::vector<std::complex<double>> forward_fft(std::span<const double> x) {
  std::vector<std::complex<double>> out(x.size() / 2 + 1);
  // FFTW takes a plain pointer but, with FFTW_PRESERVE_INPUT, leaves the input as it is.
  fftw_execute_dft_r2c(forward_plan(x.size()), const_cast<double*>(x.data()),
                       reinterpret_cast<fftw_complex*>(out.data()));
  return out;
}

std::vector<double> inverse_fft(std::span<const std::complex<double>> spectrum, std::size_t size) {
  std::vector<std::complex<double>> in(spectrum.begin(), spectrum.end());  // c2r destroys its input
  std::vector<double> out(size);
  fftw_execute_dft_c2r(inverse_plan(size), reinterpret_cast<fftw_complex*>(in.data()), out.data());
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
