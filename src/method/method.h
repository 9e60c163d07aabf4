// SPDX-License-Identifier: GPL-3.0-or-later
// A method is what is played together with what is read from the response. One pair of files and
// one registry line each; nothing else in the program knows the methods by name.
#pragma once

#include <algorithm>
#include <functional>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include "curve/floor.h"
#include "curve/loop_response.h"
#include "curve/points.h"
#include "curve/step_options.h"
#include "signal/waveform.h"

namespace kneeprint {

/// What a plan asks of every take, whatever its method.
struct TakeSettings {
  int orders = 10;                     ///< highest harmonic read
  Seconds block{0.5};                  ///< wanted; lengthened where whole cycles need it
  int blocks = 4;                      ///< wanted average; at least 3 are kept
  Seconds longest_time_constant{0.5};  ///< of the unit
  Decibels wanted_uncertainty{0.01};   ///< remaining change that counts as settled
  /// Expanded uncertainty wanted of harmonics 2 .. wanted_orders (those not under the noise); 0:
  /// nothing is wanted, the hold is as long as `blocks` says.
  Decibels wanted_harmonic_u{0.0};
  int wanted_orders = 5;
};

/// One take: this method, this frequency, this drive, held for so many blocks.
struct TakeSpec {
  std::string method;
  Hertz asked{0.0};  ///< 0 for methods that fix their tones
  LevelDbfs send;    ///< rms of the sine with the same peak
  int rung = 0;
  int hold_blocks = 0;  ///< blocks played; the first ones may be dropped as settling
  TakeSettings settings;
  StepOptions options{};
  LevelDbfs lowest;   ///< the ladder's lowest rung: where a gliding level begins
  int number = 0;     ///< in the journal
  bool down = false;  ///< taken while the ladder descends
};

/// When on its way over the ladder a method is played.
enum class Placement {
  every_rung,     ///< at the rung's level
  before_ladder,  ///< once, at the lowest rung's level
  after_ladder,   ///< once, at the highest rung that was reached
};

/// Where the steady part stands in the stimulus, and so in the aligned response.
struct HoldLayout {
  std::size_t first_block = 0;  ///< sample at which block 0 begins
  std::size_t block = 0;        ///< samples per block, whole cycles of every tone
  int blocks = 0;
  std::size_t end() const { return first_block + block * static_cast<std::size_t>(blocks); }
};

struct Stimulus {
  Waveform wave;
  /// Periodic from block to block: repeated and lost frames show there. Fewer than two blocks: not
  /// periodic, and the method's own reading looks for them where it can.
  HoldLayout hold;
  Hertz lowest_tone{0.0};
  /// Samples that the reading uses, settling included; 0: those of the hold.
  std::size_t read = 0;

  Seconds read_length() const {
    const std::size_t n = read > 0 ? read : hold.end() - hold.first_block;
    return Seconds(static_cast<double>(n) / wave.rate.value());
  }
};

/// One recorded response, aligned to its stimulus to the nearest sample.
struct TakeData {
  const Waveform& response;
  const Waveform* reference = nullptr;  ///< the drive itself, when a return was patched to the send
  double delay = 0.0;  ///< response[n] answers stimulus[n - delay]: the fraction that is left
};

/// What the rig is, as far as reading needs it.
struct RigView {
  LevelScale send, ret;
  RigFloor floor;
  LoopResponse response;
  bool sees_dc = false;
  /// A reel without declared levels: gain and volts stay empty, output is made relative later.
  bool gain_known = true;
  /// Lower than the take's own rate when a reel was recorded at another: what it can show ends
  /// there.
  std::optional<Hertz> recorded_rate;
  /// What comes back ran in a recorder's own time: tones tell it (method/time_base.h).
  bool drifting_clock = false;
  /// Told by the reel's markers where the recorder's time is too uneven for a tone's phase to tell.
  std::optional<int> marker_polarity;

  Hertz usable_rate(Hertz take_rate) const {
    return recorded_rate ? std::min(*recorded_rate, take_rate) : take_rate;
  }
};

/// What the ladder needs to know of a take at once.
struct TakeVerdict {
  bool settled = true;
  bool clipped = false;
  Seconds settling{0.0};                ///< of the hold, left out of the averages
  std::optional<double> thd_f_percent;  ///< steady methods
  std::optional<double> output_level;   ///< of the fundamental, in the return's unit
  /// By how much longer the hold must be for the wanted uncertainty of every wanted order; at most
  /// 1: reached. Empty: nothing is wanted.
  std::optional<double> longer;
};

/// Signed peak amplitudes of the products (k1, k2) of a curve driven by two sines of peaks u1 and
/// u2.
using TwoToneCurve = std::function<std::vector<double>(
    double u1, double u2, const std::vector<std::pair<int, int>>& products)>;

struct PredictedProduct {
  std::string product;  ///< as in the curve points: "m2", "total"
  double ratio = 0.0;
};

struct Method {
  std::string_view id;
  std::string_view title;   ///< for pages
  std::string_view source;  ///< published definition
  Placement placement;
  MethodNeeds needs;                                      ///< what a plan's step must or may say
  int (*first_hold_blocks)(const TakeSpec&, Hertz rate);  ///< blocks for a unit without memory
  Seconds (*block_length)(const TakeSpec&, Hertz rate);
  Stimulus (*stimulus)(const TakeSpec&, Hertz rate);
  /// Appends points to `out`. Never throws for bad data: it flags.
  TakeVerdict (*read)(const TakeSpec&, const TakeData&, const RigView&, Curves& out);
  /// The same products by a memoryless curve, for the stimulus' peak at the unit's input; nullptr
  /// for methods that the fit itself uses, or that no closed rule predicts.
  std::vector<PredictedProduct> (*predict)(const TwoToneCurve&, const StepOptions&, double peak);
  /// Throws InputError when the method cannot be played so at this rate; nullptr: no such limit.
  void (*check)(const StepOptions&, Hertz rate) = nullptr;
  /// Samples of the stimulus, where that is known without making it; nullptr: it has to be made.
  std::size_t (*length)(const TakeSpec&, Hertz rate) = nullptr;
};

std::span<const Method> methods();
/// nullptr when unknown.
const Method* find_method(std::string_view id);
/// What a plan may ask for.
std::vector<MethodNeeds> method_needs();

}  // namespace kneeprint
