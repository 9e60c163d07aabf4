// SPDX-License-Identifier: GPL-3.0-or-later
// Two steady tones and the products between them: what modulation and difference-frequency methods
// share. A product k1 f1 + k2 f2 is referred to both tones' own phases, block by block.
#pragma once

#include <array>
#include <complex>
#include <optional>
#include <string>
#include <vector>

#include "method/method.h"
#include "method/reading.h"

namespace kneeprint {

struct ProductIndex {
  int k1 = 0, k2 = 0;  ///< frequency |k1 f1 + k2 f2|
};

struct TonePair {
  std::string_view method;
  Hertz f1, f2;
  double share1 = 0.5, share2 = 0.5;  ///< of the peak, sum 1
  /// A segment in which f2 sounds alone, at its own level, shows what stands on its sidebands
  /// already.
  bool f2_alone = false;
};

int two_tone_first_hold_blocks(const TonePair& pair, const TakeSpec& spec, Hertz rate);
Seconds two_tone_block_length(const TonePair& pair, const TakeSpec& spec, Hertz rate);
std::size_t two_tone_length(const TonePair& pair, const TakeSpec& spec, Hertz rate);
Stimulus two_tone_stimulus(const TonePair& pair, const TakeSpec& spec, Hertz rate);

class TwoToneReading {
 public:
  TwoToneReading(const TonePair& pair, const TakeSpec& spec, const TakeData& take,
                 const RigView& rig);

  const TakeVerdict& verdict() const { return verdict_; }
  /// False when a tone is under the noise: nothing can be referred to it.
  bool has_tones() const { return has_tones_; }
  const Line& tone2() const { return tone2_; }
  double drive() const { return drive_; }
  LevelDbfs return_level() const { return return_level_; }

  Line product(ProductIndex p) const;
  /// Amplitude at the product's frequency while f2 sounds alone; empty without such a segment.
  std::optional<double> alone(ProductIndex p) const;
  /// Is the product below the highest frequency that this rate can show?
  bool in_reach(ProductIndex p) const;
  Hertz frequency(ProductIndex p) const;

  /// The arithmetic sum of two products over `carrier` (IEC 60268-3), as one row named `name`.
  struct Sum {
    RelativeReading reading;
    IntermodPoint point;
  };
  Sum sum(const std::string& name, std::array<ProductIndex, 2> pair, const Line& carrier,
          double rig_floor) const;
  /// As sum(), for a single product.
  Sum single(const std::string& name, ProductIndex p, const Line& carrier, double rig_floor) const;
  /// sqrt(a^2 + b^2) as row "total".
  IntermodPoint total(const Sum& a, const Sum& b) const;

 private:
  struct Part {
    double amplitude = 0, u = 0, dof = kInfiniteDof;
    std::optional<double> alone;
    bool in_reach = true;
  };
  Sum finish(const std::string& name, const Part& part, const Line& carrier,
             double rig_floor) const;
  IntermodPoint blank(const std::string& name) const;
  std::size_t bin(ProductIndex p) const;
  double turn(ProductIndex p, int block) const;

  const TonePair& pair_;
  const RigView& rig_;
  Hertz rate_;
  HoldLayout hold_, tail_;
  std::size_t cycles1_, cycles2_;
  BlockSpectra spectra_;
  std::optional<BlockSpectra> alone_spectra_;
  int first_ = 0;
  Flag take_flag_ = Flag::none;
  Line tone1_, tone2_;
  double drive_ = 0.0;
  LevelDbfs return_level_;
  bool has_tones_ = false;
  TakeVerdict verdict_;
};

}  // namespace kneeprint
