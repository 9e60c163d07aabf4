// SPDX-License-Identifier: GPL-3.0-or-later
// Dynamic intermodulation from a recording of an external generator's DIM 30 or DIM 100 signal
// through the unit. Nothing is in step: the recorder runs on its own clock, the generator may
// drift, and neither level nor start is known.
//
// The steady part is cut into blocks. In each the square's and the sine's frequency are found where
// the windowed spectrum is stationary, Im(sum n w x e^-jwn / sum w x e^-jwn) = 0 with n counted
// from the block's middle: the least-squares frequency under that window (reassignment; Auger &
// Flandrin, IEEE Trans. SP 43(5) 1995, from memory). The nine products of dim_signal.h are read at
// |f2 - k f1| under a window whose lobes stay under -180 dB, turned by both tones' own phases and
// averaged. Noise: scatter of the blocks pooled with what stands beside each product.
//
// No product falls on a harmonic of the square or on another product, where it could not be read:
// within the tuning that is accepted f2 / f1 lies between 4.57 and 4.96, and neither it nor its
// double is a whole number.
//
// What is not in the figures: the recorder's own distortion, its response between the products and
// 15 kHz, and hum, which with 3150 Hz stands on the products (all are multiples of 50 Hz). A
// recording of the generator without the unit shows all three.
#pragma once

#include <array>
#include <optional>
#include <vector>

#include "curve/points.h"
#include "method/reading.h"
#include "quantity/uncertain.h"
#include "signal/waveform.h"

namespace kneeprint {

enum class DimKind { dim30, dim100 };
std::string_view name(DimKind kind);  ///< "dim-30", "dim-100"
std::optional<DimKind> dim_kind_named(std::string_view text);

struct DimProduct {
  int k = 0;
  Hertz frequency;            ///< |f2 - k f1|, mean over blocks
  RelativeReading over_sine;  ///< the upper limit under `noise`
};

struct DimReading {
  DimKind kind = DimKind::dim30;
  Uncertain square_hz, sine_hz;    ///< against the recorder's clock
  Uncertain square_over_sine;      ///< amplitude of the square's fundamental over the sine's
  double nominal_over_sine = 0.0;  ///< the same of the standard's signal
  std::array<DimProduct, 9> products;
  RelativeReading figure;  ///< root sum of squares of the products read, over the sine
  int blocks = 0;
  Seconds start{0.0}, length{0.0};  ///< of the part that was read
  bool clipped = false;             ///< a sample reaches full scale there
};

/// `origin` names the recording in messages. Throws InputError: rate below 44.1 kHz, less than 2 s
/// of steady signal, no square within 2 % of 3.15 kHz or no sine within 2 % of 15 kHz clear of the
/// noise.
DimReading read_dim(const Waveform& recording, DimKind kind, const std::string& origin);

/// As rows of scalars.csv, method dim-30 or dim-100: `dim` in percent; `product` in dB relative to
/// the sine, one row for each k (state k1 .. k9); `square` and `sine` in Hz; `square-over-sine` in
/// dB and its nominal value.
std::vector<ScalarPoint> scalars_of(const DimReading& reading);

}  // namespace kneeprint
