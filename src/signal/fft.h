// SPDX-License-Identifier: GPL-3.0-or-later
// Real discrete Fourier transforms by FFTW, with plans made once per length and kept.
#pragma once

#include <complex>
#include <cstddef>
#include <memory>
#include <span>
#include <vector>

namespace kneeprint {

/// X[k] = sum_n x[n] exp(-j 2 pi k n / N), k = 0 .. N/2 (unnormalised). N >= 1, any factors.
/// Thread-safe; the plan of each length is made on first use (FFTW_ESTIMATE: bit-repeatable) and
/// reused.
std::vector<std::complex<double>> forward_fft(std::span<const double> x);

struct FftFree {
  void operator()(std::complex<double>* p) const;
};
/// Room for spectra, aligned as FFTW likes it and not cleared: a take's worth costs as much to
/// clear as a tenth of its transform.
using SpectrumBuffer = std::unique_ptr<std::complex<double>[], FftFree>;
SpectrumBuffer spectrum_buffer(std::size_t size);

/// The same transform, the same bits, into x.size() / 2 + 1 values at `spectrum`.
void forward_fft(std::span<const double> x, std::complex<double>* spectrum);

/// Room for samples, likewise.
struct FftFreeSamples {
  void operator()(double* p) const;
};
using SampleBuffer = std::unique_ptr<double[], FftFreeSamples>;
SampleBuffer sample_buffer(std::size_t size);

/// The inverse times N, from size / 2 + 1 values into `size`; `spectrum` is destroyed. Both as the
/// buffers above, or aligned like them (std::invalid_argument).
void inverse_fft_times_n(std::complex<double>* spectrum, double* samples, std::size_t size);

/// The inverse, divided by N. `spectrum` has size/2 + 1 values.
std::vector<double> inverse_fft(std::span<const std::complex<double>> spectrum, std::size_t size);

/// Smallest 2^a 3^b 5^c >= n: a length that FFTW transforms fast.
std::size_t fast_length(std::size_t n);

}  // namespace kneeprint
