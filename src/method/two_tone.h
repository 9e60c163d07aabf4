// SPDX-License-Identifier: GPL-3.0-or-later
// Two steady tones and the products between them: what modulation and difference-frequency methods
// share, for any pair and ratio. A product k1 f1 + k2 f2 is referred to both tones' own phases,
// block by block.
//
// Options of a step: tones_hz (f1, f2) and ratio (amplitude of f1 over that of f2) where the method
// allows them. Tones are played as coherent.h's coherent_pair() says. The two peaks add to that of
// the sine whose level the drive names.
#pragma once

#include <array>
#include <complex>
#include <map>
#include <optional>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include "method/hold.h"
#include "method/method.h"
#include "method/tone_lines.h"

namespace kneeprint {

struct TonePair {
  std::string_view method;
  Hertz f1, f2;        ///< as asked, f1 < f2
  double ratio = 1.0;  ///< amplitude of f1 over that of f2
  /// A segment in which f2 sounds alone, at its own level, shows what stands on its sidebands
  /// already.
  bool f2_alone = false;
  bool as_named = true;  ///< tones and ratio are the method's own: a measured floor belongs to it

  double share1() const { return ratio / (1.0 + ratio); }  ///< of the peak
  double share2() const { return 1.0 / (1.0 + ratio); }
};

TonePair with_options(TonePair pair, const StepOptions& options);

int two_tone_first_hold_blocks(const TonePair& pair, const TakeSpec& spec, Hertz rate);
Seconds two_tone_block_length(const TonePair& pair, const TakeSpec& spec, Hertz rate);
std::size_t two_tone_length(const TonePair& pair, const TakeSpec& spec, Hertz rate);
Stimulus two_tone_stimulus(const TonePair& pair, const TakeSpec& spec, Hertz rate);
/// Throws InputError: the upper tone is past what a converter at this rate passes, or no block
/// holds whole cycles of both.
void check_pair(const TonePair& pair, Hertz rate);

/// A method of two tones: `read` is TakeVerdict(const TonePair&, const TakeSpec&, const TakeData&,
/// const RigView&, Curves&), `predict` vector<PredictedProduct>(const TonePair&, const
/// TwoToneCurve&, double peak); kPair's tones are replaced by those of the step's options.
template <const TonePair& kPair, auto read, auto predict>
Method two_tone_method(std::string_view title, std::string_view source, MethodNeeds needs) {
  static constexpr auto pair_of = [](const StepOptions& o) { return with_options(kPair, o); };
  return {
      kPair.method,
      title,
      source,
      Placement::every_rung,
      std::move(needs),
      [](const TakeSpec& s, Hertz r) {
        return two_tone_first_hold_blocks(pair_of(s.options), s, r);
      },
      [](const TakeSpec& s, Hertz r) { return two_tone_block_length(pair_of(s.options), s, r); },
      [](const TakeSpec& s, Hertz r) { return two_tone_stimulus(pair_of(s.options), s, r); },
      [](const TakeSpec& s, const TakeData& take, const RigView& rig, Curves& out) {
        return read(pair_of(s.options), s, take, rig, out);
      },
      [](const TwoToneCurve& curve, const StepOptions& o, double peak) {
        return predict(pair_of(o), curve, peak);
      },
      [](const StepOptions& o, Hertz r) { check_pair(pair_of(o), r); },
      [](const TakeSpec& s, Hertz r) { return two_tone_length(pair_of(s.options), s, r); }};
}

class TwoToneReading {
 public:
  TwoToneReading(const TonePair& pair, const TakeSpec& spec, const TakeData& take,
                 const RigView& rig);

  const TakeVerdict& verdict() const { return verdict_; }
  /// False when a tone is under the noise: nothing can be referred to it.
  bool has_tones() const { return has_tones_; }

  /// As ToneLines::product, of the settled blocks.
  const Line& product(ProductIndex p) const;

  /// What products are referred to.
  struct Reference {
    Line line;           ///< amplitude
    double share = 1.0;  ///< of the stimulus' peak
    bool both = false;
  };
  Reference upper_tone() const;  ///< |U(f2)|
  Reference both_tones() const;  ///< |U(f1)| + |U(f2)|

  /// Several products over a reference as one row named `name`: their arithmetic sum (IEC 60268-3)
  /// or their root sum of squares. The row is empty when one of them falls on another product of
  /// order up to 5: then it cannot be told apart.
  struct Row {
    RelativeReading reading;
    IntermodPoint point;
    bool readable = true;
  };
  Row arithmetic_sum(const std::string& name, std::span<const ProductIndex> products,
                     const Reference& reference) const;
  Row root_sum(const std::string& name, std::span<const ProductIndex> products,
               const Reference& reference) const;
  /// sqrt(a^2 + b^2) as row `name`.
  IntermodPoint total(const std::string& name, const Row& a, const Row& b) const;

  /// Every product to order 5, the tones too. Where several fall on one frequency each row says so
  /// and holds their sum.
  void list_products(const Reference& reference, std::vector<ProductPoint>& out) const;

 private:
  struct Part;
  Part single(ProductIndex p, const Reference& reference) const;
  Row finish(const std::string& name, const Part& part, const Reference& reference) const;
  IntermodPoint blank(const std::string& name) const;
  ProductPoint listed(ProductIndex p, const Reference& reference) const;
  RelativeReading relative(const Part& part, const Reference& reference) const;
  RelativeReading relative_tone(ProductIndex p, const Reference& reference) const;
  double rig_floor(ProductIndex p, const Reference& reference) const;
  std::optional<double> alone(ProductIndex p) const;
  std::size_t alone_stride() const;
  std::string falls_on(ProductIndex p) const;

  TonePair pair_;
  const RigView& rig_;
  LevelDbfs send_;
  Hertz rate_;
  CoherentPair tones_;
  HoldLayout hold_, tail_;
  ToneLines lines_;
  std::vector<std::complex<double>> alone_;  // f2 alone: lines at multiples of the stride, as peaks
  std::vector<ProductIndex> products_;
  // Kept once read: rows and lists ask for the same ones again and again.
  mutable std::map<ProductIndex, Line> read_;
  mutable std::map<int, double> floors_;  // the rig's, by order
  int first_ = 0;
  Flag take_flag_ = Flag::none;
  Line tone1_, tone2_;
  double drive_ = 0.0;
  LevelDbfs return_level_;
  bool has_tones_ = false;
  TakeVerdict verdict_;
};

}  // namespace kneeprint
