// SPDX-License-Identifier: GPL-3.0-or-later
// The results, as plain tables: one struct per row of each CSV. Columns, definitions and sources
// are those of the README, "The tables, column by column". An empty optional is an empty cell: not
// measured, or not measurable on this rig; never a made-up zero.
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "curve/level_scale.h"

namespace kneeprint {

using Cell = std::optional<double>;

/// Doubt that travels with a point. `noise` points are 95 % upper limits, not values.
enum class Flag { none, floor, noise, alias, clipped, unsteady };
std::string_view name(Flag flag);  ///< "" for none
std::optional<Flag> flag_named(std::string_view text);

struct HarmonicPoint {
  double frequency_hz = 0.0;  ///< as played, after the shift to whole cycles
  double drive = 0.0;         ///< at the unit's input, rms of the sine, in `unit`
  LevelUnit unit = LevelUnit::dbfs;
  int order = 1;
  Cell level;          ///< rms of the harmonic at the unit's output, in `unit`
  Cell relative_db;    ///< to the fundamental; 0 for order 1; the upper limit under `noise`
  Cell phase_deg;      ///< cosine reference, minus n times the output fundamental's, -180 .. 180
  Cell expanded_u_db;  ///< 95 %, of relative_db; empty for order 1
  Cell floor_db;       ///< rig floor relative to the fundamental; empty when unknown
  Flag flag = Flag::none;
  Cell level_u_db;        ///< 95 %, of level
  Cell relative_low_db;   ///< 95 % interval's lower end; empty = reaches zero amplitude
  Cell relative_high_db;  ///< and its upper end
  // The same harmonic as a phasor in volts peak (or full scales), upright, phase-referenced to the
  // output fundamental: what the fit uses, unbiased also under the noise.
  double in_phase = 0.0;
  double quadrature = 0.0;
  double component_u = 0.0;  ///< standard uncertainty of each component: noise and rig floor
  double dof = kInfiniteDof;
  std::string direction = "up";  ///< of the ladder when it was taken: up, down
  // Of level, from noise alone (type A): for comparisons in which all else is common. Not in the
  // table.
  double noise_u_db = 0.0;  ///< standard uncertainty; 0: unknown
  double noise_dof = kInfiniteDof;
};

struct LevelPoint {
  double frequency_hz = 0.0;
  double drive = 0.0;
  LevelUnit unit = LevelUnit::dbfs;
  Cell output;  ///< level of the fundamental (on a reel: dB above the lowest usable rung)
  Cell gain_db, gain_u_db;
  Cell thd_f_percent, thd_r_percent;
  int thd_orders = 0;  ///< last order that the THD sums
  Cell thdn_percent;
  Cell dc;     ///< volts (or full scales)
  Cell noise;  ///< level of what is neither DC nor harmonic, 20 Hz to 20 kHz
  Cell even_odd_db;
  Flag flag = Flag::none;
  Cell output_u_db, thd_f_u_percent, thd_r_u_percent, thdn_u_percent, dc_u, noise_u_db,
      even_odd_u_db;
  Cell sinad_db, sinad_u_db;
  Cell polarity;          ///< +1 upright, -1 inverting, empty when it cannot be stated
  double asked_hz = 0.0;  ///< the frequency the plan named
  int blocks = 0;         ///< averaged
  double settled_after_s = 0.0;
  std::string direction = "up";  ///< of the ladder when it was taken: up, down
  /// Why the take ended: reached (the wanted uncertainty), time-spent, floor (the rig's own is too
  /// large for it), fixed (nothing was wanted).
  std::string integration = "fixed";
};

struct IntermodPoint {
  std::string method;  ///< smpte, din, modulation, ccif, tdfd, square-sine
  double f1_hz = 0.0, f2_hz = 0.0;
  double drive = 0.0;  ///< rms of the sine with the same peak
  LevelUnit unit = LevelUnit::dbfs;
  /// m2, m3, d2, d3, total; their root-sum-of-squares forms m2-rss, m3-rss, d3-rss, total-rss;
  /// square-sine.
  std::string product;
  Cell percent, db, expanded_u_db, floor_db;
  Flag flag = Flag::none;
  Cell am_percent, pm_percent;  ///< the pair's amplitude and phase modulation parts
  int blocks = 0;               ///< averaged
  double settled_after_s = 0.0;
  double ratio = 1.0;  ///< amplitude of f1 over that of f2, as played
};

struct ResponsePoint {
  double frequency_hz = 0.0;  ///< of the fundamental that was played
  double drive = 0.0;
  LevelUnit unit = LevelUnit::dbfs;
  int order = 1;
  Cell magnitude_db;  ///< level of the order at the output minus drive
  Cell phase_deg;     ///< order 1: output minus input, the rig's delay removed; else as harmonics
  Cell expanded_u_db;
  Flag flag = Flag::none;
  std::string method = "steady";  ///< steady, sweep
};

/// One line of a spectrum of two (or more) tones: k1 f1 + k2 f2.
struct ProductPoint {
  std::string method;
  double f1_hz = 0.0, f2_hz = 0.0;
  double drive = 0.0;  ///< rms of the sine with the same peak
  LevelUnit unit = LevelUnit::dbfs;
  int k1 = 0, k2 = 0;
  int order = 0;              ///< |k1| + |k2|
  double frequency_hz = 0.0;  ///< |k1 f1 + k2 f2|
  Cell level;                 ///< rms at the unit's output, in `unit`
  Cell relative_db;           ///< to the method's reference (f2, or the sum of both tones)
  Cell phase_deg;             ///< cosine reference, minus k1 and k2 times the output tones' phases
  Cell expanded_u_db;         ///< 95 %, of relative_db
  Flag flag = Flag::none;
  std::string note = "-";  ///< "falls on 2f2-f1", "past the highest frequency shown"; "-": nothing
};

/// A harmonic tracked while the level glides.
struct GlidePoint {
  double frequency_hz = 0.0;
  std::string direction = "up";  ///< up, down
  double drive = 0.0;
  LevelUnit unit = LevelUnit::dbfs;
  int order = 1;
  Cell level, relative_db, phase_deg, expanded_u_db, floor_db;  ///< as in HarmonicPoint
  Flag flag = Flag::none;
};

/// One figure that is a single number with a name: noise, fill, a recovery time, a loop's width.
struct ScalarPoint {
  std::string method;
  Cell frequency_hz;  ///< where the figure belongs to one
  Cell drive;         ///< likewise
  LevelUnit unit = LevelUnit::dbfs;
  std::string figure;       ///< stable id: "noise-a", "fill", "recovery"
  std::string state = "-";  ///< condition that tells rows of one figure apart; "-": none
  Cell value;
  std::string value_unit;  ///< "dBu", "dB", "%", "s", "Hz"; "1" for plain ratios
  Cell expanded_u;         ///< 95 %, in value_unit
  Cell floor;              ///< the rig's own, in value_unit
  Flag flag = Flag::none;
};

/// A sampled curve that belongs to one take: distortion per band, gain against time.
struct TracePoint {
  std::string method;
  Cell drive;
  LevelUnit unit = LevelUnit::dbfs;
  std::string trace;  ///< stable id: "distortion", "masked-threshold", "gain"
  double x = 0.0;
  std::string x_unit;  ///< "Hz", "s"
  Cell value;
  std::string value_unit;
  Cell expanded_u;  ///< 95 %, in value_unit
  Flag flag = Flag::none;
};

struct Curves {
  std::vector<LevelPoint> levels;
  std::vector<HarmonicPoint> harmonics;
  std::vector<IntermodPoint> intermods;
  std::vector<ResponsePoint> responses;
  std::vector<ProductPoint> products;
  std::vector<GlidePoint> glides;
  std::vector<ScalarPoint> scalars;
  std::vector<TracePoint> traces;

  bool empty() const;
  /// All rows of `more` after these.
  void append(Curves&& more);
};

}  // namespace kneeprint
