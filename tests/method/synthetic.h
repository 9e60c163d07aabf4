// SPDX-License-Identifier: GPL-3.0-or-later
// Takes made by passing a stimulus through a memoryless curve, with seeded noise where asked.
#pragma once

#include <algorithm>
#include <cmath>
#include <functional>
#include <numbers>
#include <random>
#include <stdexcept>

#include "method/method.h"

namespace kneeprint::testing {

inline TakeSpec spec_for(const std::string& method, double asked_hz, double send_dbfs,
                         Hertz rate = Hertz(48000.0)) {
  TakeSpec spec;
  spec.method = method;
  spec.asked = Hertz(asked_hz);
  spec.send = LevelDbfs(send_dbfs);
  if (find_method(method)->needs.tones_required) {
    spec.options.tones = {Hertz(300.0), Hertz(6500.0)};
  }
  spec.hold_blocks = find_method(method)->first_hold_blocks(spec, rate);
  return spec;
}

inline Waveform response(const TakeSpec& spec, const std::function<double(double)>& curve,
                         double noise_sigma = 0.0, unsigned seed = 1, Hertz rate = Hertz(48000.0)) {
  Waveform w = find_method(spec.method)->stimulus(spec, rate).wave;
  std::mt19937_64 random(seed);
  std::normal_distribution<double> noise(0.0, 1.0);
  for (double& x : w.samples) {
    x = curve(x);
    if (noise_sigma > 0.0) x += noise_sigma * noise(random);
  }
  return w;
}

inline Curves read(const TakeSpec& spec, const Waveform& take, const RigView& rig = {},
                   TakeVerdict* verdict = nullptr) {
  Curves curves;
  const TakeVerdict v = find_method(spec.method)->read(spec, {take}, rig, curves);
  if (verdict != nullptr) *verdict = v;
  return curves;
}

}  // namespace kneeprint::testing
