// SPDX-License-Identifier: GPL-3.0-or-later
// A bare sigmoid with bias, in volts: y = limit (S(drive x + bias) - S(bias)).
// The truth against which fits are judged, so it shares no code with them.
#pragma once

#include <optional>

#include "unit/odd_table.h"
#include "unit/unit.h"

namespace kneeprint {

enum class SigmoidShape { tanh, atan, algebraic, erf };

/// S(x): tanh x; (2/pi) atan(pi x/2); x/(1+|x|^p)^(1/p); erf(sqrt(pi) x/2). S'(0) = 1, S(inf) = 1.
/// Only `algebraic` reads `sharpness` p (1 .. 20).
double sigmoid_shape(SigmoidShape shape, double sharpness, double x);

class SigmoidUnit : public VirtualUnit {
 public:
  struct Parameters {
    SigmoidShape shape = SigmoidShape::tanh;
    double limit = 4.0;  ///< V
    double drive = 0.4;  ///< 1/V
    double bias = 0.15;
    double sharpness = 2.0;
  };
  explicit SigmoidUnit(const Parameters& parameters);

  void process(std::span<double> volts) override;

 private:
  double shape(double x) const;
  Parameters p_;
  double rest_;                    ///< S(bias)
  std::optional<OddTable> table_;  ///< within 1e-12 of S; not for algebraic
};

extern const UnitRecord kSigmoidUnit;

}  // namespace kneeprint
