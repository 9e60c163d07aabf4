// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/sigmoid.h"

#include <cmath>
#include <numbers>

#include "unit/settings.h"

namespace kneeprint {
namespace {

const double kHalfRootPi = 0.5 * std::sqrt(std::numbers::pi);

OddTable::Sample with_slope(SigmoidShape shape, double x) {
  const double s = sigmoid_shape(shape, 0.0, x);
  switch (shape) {
    case SigmoidShape::tanh:
      return {s, 1.0 - s * s};
    case SigmoidShape::atan: {
      const double u = 0.5 * std::numbers::pi * x;
      return {s, 1.0 / (1.0 + u * u)};
    }
    default:
      return {s, std::exp(-kHalfRootPi * kHalfRootPi * x * x)};
  }
}

std::unique_ptr<VirtualUnit> make_sigmoid(const UnitSettings& settings, Hertz) {
  SettingsReader reader("sigmoid", settings);
  SigmoidUnit::Parameters p;
  p.shape =
      static_cast<SigmoidShape>(reader.choice("family", 0, {"tanh", "atan", "algebraic", "erf"}));
  p.limit = reader.number("limit", p.limit, 1e-3, 1e3);
  p.drive = reader.number("drive", p.drive, 1e-6, 1e3);
  p.bias = reader.number("bias", p.bias, -10.0, 10.0);
  p.sharpness = reader.number("sharpness", p.sharpness, 1.0, 20.0);
  reader.finish();
  return std::make_unique<SigmoidUnit>(p);
}

}  // namespace

double sigmoid_shape(SigmoidShape shape, double sharpness, double x) {
  switch (shape) {
    case SigmoidShape::tanh:
      return std::tanh(x);
    case SigmoidShape::atan:
      return 2.0 / std::numbers::pi * std::atan(0.5 * std::numbers::pi * x);
    case SigmoidShape::algebraic: {
      if (sharpness == 2.0) return x / std::sqrt(1.0 + x * x);
      const double magnitude = std::fabs(x);
      // Divided through by x beyond 1, so that no power overflows.
      if (magnitude <= 1.0) {
        return x / std::pow(1.0 + std::pow(magnitude, sharpness), 1.0 / sharpness);
      }
      return std::copysign(std::pow(1.0 + std::pow(magnitude, -sharpness), -1.0 / sharpness), x);
    }
    default:
      return std::erf(kHalfRootPi * x);
  }
}

SigmoidUnit::SigmoidUnit(const Parameters& parameters) : p_(parameters) {
  if (p_.shape != SigmoidShape::algebraic) {
    // 1024 cells per octave from 1/2 up: |S''''| < 8 puts the cubic's error under 1e-13.
    table_.emplace([this](double x) { return with_slope(p_.shape, x); }, 30.0, 0.5, 10);
  }
  rest_ = shape(p_.bias);
}

double SigmoidUnit::shape(double x) const {
  if (table_ && std::fabs(x) < table_->limit()) return (*table_)(x);
  return sigmoid_shape(p_.shape, p_.sharpness, x);
}

void SigmoidUnit::process(std::span<double> volts) {
  for (double& v : volts) v = p_.limit * (shape(p_.drive * v + p_.bias) - rest_);
}

constinit const UnitRecord kSigmoidUnit{
    "sigmoid",
    "bare sigmoid with bias (invented)",
    "Memoryless: limit (S(drive x + bias) - S(bias)), x in volts; S = tanh x, (2/pi) atan(pi x/2), "
    "x/(1+|x|^p)^(1/p) or erf(sqrt(pi) x/2).",
    64,
    "family=tanh|atan|algebraic|erf, limit (V), drive (1/V), bias, sharpness (algebraic, 1 to 20)",
    make_sigmoid};

}  // namespace kneeprint
