// SPDX-License-Identifier: GPL-3.0-or-later
// An invented measurement for tests of pages: a biased tanh measured over a ladder at three
// frequencies and with two tones, with noise, upper limits and a rig floor.
#pragma once

#include <cmath>
#include <numbers>

#include "report/report.h"

namespace kneeprint {

struct SampleOptions {
  double from = -36.0, to = 22.0, step = 2.0;  ///< dBu
  double limit = 11.0, drive = 0.14, bias = 0.22;
  bool with_model = true;
};

class SampleReport {
 public:
  explicit SampleReport(SampleOptions options = {}) : o_(options) {}

  ReportData make() {
    ReportData d;
    d.plan.name = "portrait";
    d.plan.ladder = {{o_.from, PlanUnit::dbu}, {o_.to, PlanUnit::dbu}, Decibels(o_.step)};
    d.plan.steps = {{"steady", {Hertz(41), Hertz(997), Hertz(4990)}}, {"smpte", {}}, {"ccif", {}}};
    d.plan.orders = 7;
    d.rig.name = "Virtual converters, +24 dBu";
    d.rig.kind = RigKind::virtual_rig;
    d.rig.device = "virtual:sigmoid";
    d.rig.send_scale = d.rig.return_scale =
        LevelScale::calibrated(VoltsRms(12.276529880), Decibels(0.01));
    d.rig.dc_coupled_send = d.rig.dc_coupled_return = true;
    d.rig.wiring = "balanced";
    d.rig.source_impedance = Ohms(50.0);
    d.rig.load_impedance = Ohms(10000.0);
    d.rig.calibrated_on = "2026-05-01";
    d.rig.invented = true;
    d.rig.floor = RigFloor({{LevelDbfs(-60.0), 2, Decibels(-110.0)}});
    d.journal.begin = {"Invented preamp, channel 2", 7, "2026-05-04T10:00:00Z", "kneeprint 0.1.0"};

    int rung = 0, take = 1;
    for (double level = o_.from; level <= o_.to + 1e-9; level += o_.step, ++rung) {
      for (const auto& [asked, played] :
           {std::pair{41.0, 41.015625}, std::pair{997.0, 997.0}, std::pair{4990.0, 4987.0}}) {
        add_steady(d.curves, level, asked, played);
        JournalTake t;
        t.number = take++;
        t.method = "steady";
        t.frequency_hz = asked;
        t.rung = rung;
        t.started = t.ended = "2026-05-04T10:01:00Z";
        d.journal.takes.push_back(t);
      }
      add_two_tone(d.curves, level);
    }
    d.journal.stops = {{"top", "The ladder ended at its top.", "2026-05-04T10:09:00Z"}};
    if (o_.with_model)
      d.model = model();
    else
      d.why_no_model = "Fewer than 3 drives were usable.";
    return d;
  }

  double curve(double x) const {
    return o_.limit * (std::tanh(o_.drive * x + o_.bias) - std::tanh(o_.bias));
  }

 private:
  static constexpr double kNoiseU = 3e-6;  ///< of one component, volts
  static constexpr double kFloor = 3e-6;   ///< relative to the fundamental

  /// Between -1 and 1, the same in every run.
  double scatter() {
    state_ = state_ * 1664525u + 1013904223u;
    return static_cast<double>(state_) / 2147483648.0 - 1.0;
  }

  static double db(double ratio) { return 20.0 * std::log10(ratio); }

  std::vector<double> harmonics(double peak) const {
    constexpr int kPoints = 256;
    std::vector<double> h(8, 0.0);
    for (int i = 0; i < kPoints; ++i) {
      const double a = 2.0 * std::numbers::pi * i / kPoints;
      for (int n = 0; n < 8; ++n)
        h[static_cast<std::size_t>(n)] +=
            curve(peak * std::cos(a)) * std::cos(n * a) * (n == 0 ? 1.0 : 2.0) / kPoints;
    }
    return h;
  }

  double product(double u1, double u2, int k1, int k2) const {
    constexpr int kPoints = 64;
    double sum = 0.0;
    for (int i = 0; i < kPoints; ++i)
      for (int j = 0; j < kPoints; ++j) {
        const double a = 2.0 * std::numbers::pi * i / kPoints,
                     b = 2.0 * std::numbers::pi * j / kPoints;
        sum += curve(u1 * std::cos(a) + u2 * std::cos(b)) * std::cos(k1 * a + k2 * b);
      }
    return 2.0 * sum / (kPoints * kPoints);
  }

  void add_steady(Curves& c, double level, double asked, double played) {
    const LevelScale scale = LevelScale::calibrated(VoltsRms(12.276529880), Decibels(0.01));
    const double peak = scale.peak_of_level(level) * (asked < 100.0 ? 1.12 : 1.0);
    const auto h = harmonics(peak);
    LevelPoint l;
    l.frequency_hz = played;
    l.asked_hz = asked;
    l.drive = level;
    l.unit = LevelUnit::dbu;
    l.output = scale.level_of_peak(std::abs(h[1]) / scale.peak_per_full_scale);
    l.output_u_db = 0.02;
    l.gain_db = *l.output - level;
    l.gain_u_db = 0.028;
    double even = 0.0, odd = 0.0;
    bool any = false;
    for (int n = 1; n <= 7; ++n) {
      HarmonicPoint p;
      p.frequency_hz = played;
      p.drive = level;
      p.unit = LevelUnit::dbu;
      p.order = n;
      p.component_u = kNoiseU;
      const double amplitude =
          std::abs(h[static_cast<std::size_t>(n)] + (n > 1 ? 2.0 * kNoiseU * scatter() : 0.0));
      p.in_phase = amplitude;
      if (n == 1) {
        p.relative_db = 0.0;
      } else {
        const double u = 2.0 * std::hypot(kNoiseU, kFloor * std::abs(h[1]) / std::numbers::sqrt2);
        p.floor_db = db(kFloor);
        if (amplitude < u) {
          p.flag = Flag::noise;
          p.relative_db = db((amplitude + u) / std::abs(h[1]));
        } else {
          any = true;
          p.relative_db = db(amplitude / std::abs(h[1]));
          p.expanded_u_db = db(1.0 + u / amplitude);
          if (amplitude > u) p.relative_low_db = db((amplitude - u) / std::abs(h[1]));
          p.relative_high_db = db((amplitude + u) / std::abs(h[1]));
          (n % 2 ? odd : even) += amplitude * amplitude;
        }
      }
      c.harmonics.push_back(p);
    }
    l.thd_orders = 7;
    const double thd = std::sqrt(even + odd) / std::abs(h[1]);
    l.thd_f_percent = any ? 100.0 * thd : 100.0 * 4.0 * kNoiseU / std::abs(h[1]);
    l.thd_f_u_percent = 100.0 * std::hypot(2.0 * kNoiseU / std::abs(h[1]), kFloor);
    l.thd_r_percent = 100.0 * thd / std::sqrt(1.0 + thd * thd);
    l.thd_r_u_percent = l.thd_f_u_percent;
    if (!any) l.flag = Flag::noise;
    const double noise = 1.5e-4 / std::abs(h[1]);
    l.thdn_percent = 100.0 * std::hypot(thd, noise);
    l.thdn_u_percent = 0.01 * *l.thdn_percent;
    l.sinad_db = -db(*l.thdn_percent / 100.0);
    l.sinad_u_db = 0.09;
    l.noise = -76.2;
    l.noise_u_db = 0.2;
    l.dc = h[0];
    l.dc_u = 2e-5;
    if (even > 0.0 && odd > 0.0) {
      l.even_odd_db = 10.0 * std::log10(even / odd);
      l.even_odd_u_db = 20.0 * kNoiseU / std::sqrt(odd);
    }
    l.polarity = 1.0;
    l.blocks = 4;
    l.settled_after_s = 0.5;
    c.levels.push_back(l);
  }

  void add_product(Curves& c, IntermodPoint p, const char* id, double ratio, double reference) {
    p.product = id;
    const double u = 3.0 * kNoiseU / reference;
    const double seen = std::abs(ratio + u * scatter() / 2.0);
    p.floor_db = db(2.0 * kFloor);
    if (seen < u) {
      p.flag = Flag::noise;
      p.db = db(seen + u);
    } else {
      p.db = db(seen);
      p.expanded_u_db = db(1.0 + u / seen);
    }
    p.percent = 100.0 * std::pow(10.0, *p.db / 20.0);
    c.intermods.push_back(p);
    HoldoutPoint held{p.method, id, p.drive, {}, {}, db(ratio)};
    if (p.flag == Flag::none) {
      held.measured_db = p.db;
      held.expanded_u_db = p.expanded_u_db;
    }
    holdout_.push_back(held);
  }

  void add_two_tone(Curves& c, double level) {
    const double peak =
        LevelScale::calibrated(VoltsRms(12.276529880), Decibels(0.01)).peak_of_level(level);
    IntermodPoint p;
    p.drive = level;
    p.unit = LevelUnit::dbu;
    p.method = "smpte";
    p.f1_hz = 60.0;
    p.f2_hz = 7000.0;
    const double u1 = 0.8 * peak, u2 = 0.2 * peak;
    const double top = std::abs(product(u1, u2, 0, 1));
    const double m2 = 2.0 * std::abs(product(u1, u2, 1, 1)) / top;
    const double m3 = 2.0 * std::abs(product(u1, u2, 2, 1)) / top;
    add_product(c, p, "m2", m2, top);
    add_product(c, p, "m3", m3, top);
    p.method = "ccif";
    p.f1_hz = 19000.0;
    p.f2_hz = 20000.0;
    const double half = peak / 2.0;
    const double sum = 2.0 * std::abs(product(half, half, 0, 1));
    add_product(c, p, "d2", std::abs(product(half, half, -1, 1)) / sum, sum);
    add_product(c, p, "d3", 2.0 * std::abs(product(half, half, 2, -1)) / sum, sum);
  }

  static FittedParameter parameter(double value, double u) {
    return {value, u, value - 1.96 * u, value + 1.96 * u};
  }

  Model model() const {
    Model m;
    m.polarity = 1;
    m.fit_frequency_hz = 997.0;
    m.axis_unit = "V";
    m.drive_unit = "dBu";
    m.frequency_checked = true;
    double aicc = -1520.4;
    for (const auto& family : sigmoid_families()) {
      FittedFamily f;
      f.family = &family;
      f.limit = parameter(o_.limit, 0.011);
      f.drive = parameter(o_.drive, 0.00016);
      f.bias = parameter(o_.bias, 0.0006);
      if (family.has_sharpness) f.sharpness = parameter(2.4, 0.03);
      f.chi_square = 118.0;
      f.data = 131;
      f.parameters = family.has_sharpness ? 5 : 4;
      f.aicc = aicc;
      aicc += 140.7;
      f.discrepancy = m.fit.families.empty() ? 0.0 : 2e-3;
      f.reach = 0.93;
      f.converged = true;
      m.fit.families.push_back(f);
      HoldoutFamily h;
      h.family = std::string(family.id);
      h.points = holdout_;
      h.compared = 40;
      h.rms_error_db = 0.04;
      h.worst_error_db = 0.2;
      m.holdout.push_back(h);
    }
    m.fit.best = 0;
    m.fit.equally_good = {0};
    m.fit.limit_low = 10.9;
    m.fit.limit_high = 11.4;
    return m;
  }

  SampleOptions o_;
  std::vector<HoldoutPoint> holdout_;
  unsigned state_ = 12345u;
};

}  // namespace kneeprint
