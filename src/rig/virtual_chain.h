// SPDX-License-Identifier: GPL-3.0-or-later
// One take through the virtual converters and the unit between them, as virtual_port.h draws it.
#pragma once

#include <array>
#include <boost/random/mersenne_twister.hpp>
#include <boost/random/normal_distribution.hpp>
#include <cstdint>
#include <memory>
#include <span>
#include <vector>

#include "rig/virtual_port.h"
#include "signal/oversample.h"
#include "unit/unit.h"

namespace kneeprint {

/// A whole number of samples and a fraction; the fraction by Lagrange interpolation over eight
/// samples, within -170 dB where signals stay under 1/32 of the rate.
class OversampledDelay {
 public:
  /// samples >= 0; a fraction needs samples >= 3.
  explicit OversampledDelay(double samples);
  void process(std::span<double> x);

 private:
  std::size_t whole_;
  std::vector<double> taps_;  ///< empty: no fraction
  std::vector<double> buffer_;
  std::size_t history_;
};

/// Noise and quantiser of one converter, seeded for one take.
class ConverterNoise {
 public:
  ConverterNoise(const ConverterModel& model, std::uint64_t seed);
  double noise();                 ///< in full scales, Gaussian, white
  double quantise(double value);  ///< 24 bits, TPDF dither, limited to +-1

 private:
  bool noiseless_;
  bool quantise_;
  boost::random::mt19937_64 random_;
  boost::random::normal_distribution<double> normal_;
};

/// First-order high-pass, y' + w y = x' by the trapezoidal rule: exact at DC, and its corner warped
/// by less than 1e-6 at the oversampled rate.
class Coupling {
 public:
  Coupling(Hertz corner, Hertz rate);  ///< corner 0: passes everything
  void process(std::span<double> x);

 private:
  double pole_, gain_;
  double before_ = 0.0, y_ = 0.0;
};

class VirtualChain {
 public:
  /// Starts at the settled rest of the take. Throws UsageError for an unknown unit or setting, and
  /// for a latency shorter than the filters and `buffer` frames need.
  VirtualChain(const VirtualRigName& name, Hertz rate, std::uint64_t seed,
               const ConverterModel& model, int take, std::size_t buffer);

  /// Any number of frames. The round trip from sent[n] to returned[n] is latency_samples - buffer:
  /// a driver hands returned samples out one buffer before it takes the next to send.
  /// `reference` may be empty; else it is what a split at the unit's input returns.
  void process(std::span<const float> sent, std::span<float> returned, std::span<float> reference);

 private:
  /// From volts at the higher rate to return samples: residual, decimation, delay, noise, clip.
  struct Return {
    double samples_per_volt;
    Coupling coupling;
    OversampledDelay fine_delay;
    Decimator decimator;
    std::vector<double> coarse_delay;  ///< ring
    std::size_t coarse_position;
    ConverterNoise noise;
  };
  void take_in(Return& path, std::span<double> volts, std::span<float> out);
  void distort(std::span<double> volts) const;
  Return make_return(Hertz high_rate, std::uint64_t seed, double gain_error_db, double fine,
                     std::size_t coarse) const;

  ConverterModel model_;
  double full_scale_peak_;   ///< V, stated
  double square_, cube_;     ///< residual: x + square x^2 + cube x^3 in volts
  double volts_per_sample_;  ///< send, true
  int factor_;
  Interpolator interpolator_;
  Coupling send_coupling_;
  std::unique_ptr<VirtualUnit> unit_;
  ConverterNoise send_noise_;
  std::vector<Return> returns_;  ///< the unit's, and the reference's where there is one
  std::vector<double> base_, high_, split_;
};

/// The power of two nearest to the unit's oversampling at `rate`, at least 16.
int oversampling_at(const UnitRecord& unit, Hertz rate);

}  // namespace kneeprint
