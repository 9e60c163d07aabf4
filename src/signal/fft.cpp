// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/fft.h"

#include <fftw3.h>

#include <algorithm>
#include <limits>
#include <map>
#include <memory>
#include <mutex>
#include <new>
#include <stdexcept>

namespace kneeprint {
namespace {

struct PlanDeleter {
  void operator()(fftw_plan_s* p) const { fftw_destroy_plan(p); }
};
using PlanPtr = std::unique_ptr<fftw_plan_s, PlanDeleter>;

fftw_complex* raw(std::complex<double>* p) { return reinterpret_cast<fftw_complex*>(p); }

bool is_aligned(const double* p) { return fftw_alignment_of(const_cast<double*>(p)) == 0; }

// FFTW_ESTIMATE measures nothing, so the same length gives the same plan and the same bits every
// time. Plans are for aligned arrays: without that FFTW does without vector instructions, at more
// than twice the time. What is not aligned is copied, so that the bits do not depend on where a
// span begins.
PlanPtr make_forward(int n) {
  const auto size = static_cast<std::size_t>(n);
  const SampleBuffer in = sample_buffer(size);
  const SpectrumBuffer out = spectrum_buffer(size / 2 + 1);
  return PlanPtr(
      fftw_plan_dft_r2c_1d(n, in.get(), raw(out.get()), FFTW_ESTIMATE | FFTW_PRESERVE_INPUT));
}

PlanPtr make_inverse(int n) {
  const auto size = static_cast<std::size_t>(n);
  const SpectrumBuffer in = spectrum_buffer(size / 2 + 1);
  const SampleBuffer out = sample_buffer(size);
  return PlanPtr(fftw_plan_dft_c2r_1d(n, raw(in.get()), out.get(), FFTW_ESTIMATE));
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

void FftFree::operator()(std::complex<double>* p) const { fftw_free(p); }

SpectrumBuffer spectrum_buffer(std::size_t size) {
  SpectrumBuffer p(reinterpret_cast<std::complex<double>*>(fftw_alloc_complex(size)));
  if (!p) throw std::bad_alloc();
  return p;
}

void FftFreeSamples::operator()(double* p) const { fftw_free(p); }

SampleBuffer sample_buffer(std::size_t size) {
  SampleBuffer p(fftw_alloc_real(size));
  if (!p) throw std::bad_alloc();
  return p;
}

void forward_fft(std::span<const double> x, std::complex<double>* spectrum) {
  static Plans plans(make_forward);
  const fftw_plan plan = plans.of(x.size());
  SampleBuffer copied_in;
  SpectrumBuffer copied_out;
  // FFTW takes a plain pointer but, with FFTW_PRESERVE_INPUT, leaves the input as it is.
  auto* in = const_cast<double*>(x.data());
  std::complex<double>* out = spectrum;
  if (!is_aligned(in)) {
    copied_in = sample_buffer(x.size());
    in = copied_in.get();
    std::copy(x.begin(), x.end(), in);
  }
  const std::size_t bins = x.size() / 2 + 1;
  if (!is_aligned(reinterpret_cast<double*>(out))) {
    copied_out = spectrum_buffer(bins);
    out = copied_out.get();
  }
  fftw_execute_dft_r2c(plan, in, raw(out));
  if (copied_out) std::copy(out, out + bins, spectrum);
}

std::vector<std::complex<double>> forward_fft(std::span<const double> x) {
  std::vector<std::complex<double>> out(x.size() / 2 + 1);
  forward_fft(x, out.data());
  return out;
}

void inverse_fft_times_n(std::complex<double>* spectrum, double* samples, std::size_t size) {
  static Plans plans(make_inverse);
  const fftw_plan plan = plans.of(size);
  if (!is_aligned(samples) || !is_aligned(reinterpret_cast<double*>(spectrum))) {
    throw std::invalid_argument("an inverse transform in place needs aligned arrays");
  }
  fftw_execute_dft_c2r(plan, raw(spectrum), samples);
}

std::vector<double> inverse_fft(std::span<const std::complex<double>> spectrum, std::size_t size) {
  if (size > 0 && spectrum.size() != size / 2 + 1) {
    throw std::invalid_argument("an inverse transform of N samples needs N/2 + 1 spectrum values");
  }
  const SpectrumBuffer in = spectrum_buffer(spectrum.size());
  std::copy(spectrum.begin(), spectrum.end(), in.get());
  const SampleBuffer samples = sample_buffer(size);
  inverse_fft_times_n(in.get(), samples.get(), size);
  std::vector<double> out(size);
  for (std::size_t n = 0; n < size; ++n) out[n] = samples[n] / static_cast<double>(size);
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
