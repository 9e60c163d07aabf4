// SPDX-License-Identifier: GPL-3.0-or-later
// Cosine-sum windows in periodic form: w[n] = sum_k (-1)^k a_k cos(2 pi k n / N), n = 0 .. N-1.
// Sources: Harris, Proc. IEEE 66(1) 1978 (hann, blackman-harris-4); Nuttall, IEEE Trans. ASSP 29(1)
// 1981 (nuttall-4c); Heinzel, Ruediger, Schilling, "Spectrum and spectral density estimation by the
// DFT", MPI Hannover 2002 (hft144d, hft248d); Albrecht, ICASSP 2001 (albrecht-7).
#pragma once

#include <cstddef>
#include <span>
#include <string_view>
#include <vector>

namespace kneeprint {

struct Window {
  std::string_view id;
  std::span<const double> coefficients;  ///< a_0, a_1, ...; a_0 = coherent gain
  std::string_view source;
};

/// Every window known, for tests and lists.
std::span<const Window> windows();
/// By id; throws std::out_of_range for an unknown one (a programming error).
const Window& window(std::string_view id);

std::vector<double> sample(const Window& w, std::size_t size);

/// Equivalent noise bandwidth in bins: (a_0^2 + sum a_k^2 / 2) / a_0^2 (Harris 1978 eq. 11).
double noise_bandwidth_bins(const Window& w);
/// |W(f)| / W(0) at `bins` from the centre, in the limit of many samples.
double relative_response(const Window& w, double bins);
/// Response half a bin off centre, in dB (Harris 1978, "scallop loss").
double scallop_db(const Window& w);
/// Highest sidelobe in dB, searched beyond the first null (at as many bins as coefficients).
double highest_sidelobe_db(const Window& w);

}  // namespace kneeprint
