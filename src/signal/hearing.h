// SPDX-License-Identifier: GPL-3.0-or-later
// A simple model of what a steady sound masks: auditory filters on the ERB-number scale and the
// threshold in quiet. A prediction for a normal ear, both ears and steady sounds; no listening test
// stands behind a single figure of it.
#pragma once

#include <span>

#include "quantity/quantity.h"

namespace kneeprint {

/// Equivalent rectangular bandwidth 24.7 (4.37 F + 1), F in kHz (Glasberg & Moore 1990, eq. 3).
Hertz erb_width(Hertz f);
/// ERB-number 21.4 log10(4.37 F + 1) (Glasberg & Moore 1990, eq. 4). f >= 0.
double erb_number(Hertz f);
Hertz frequency_of_erb_number(double number);

/// Threshold in quiet in dB SPL: 3.64 F^-0.8 - 6.5 exp(-0.6 (F - 3.3)^2) + 10^-3 F^4, F in kHz
/// (Terhardt 1979, eq. 1). 20 Hz to 20 kHz.
double threshold_in_quiet(Hertz f);

struct AudibleTone {
  Hertz frequency;
  double db_spl = 0.0;
};

/// Excitation in dB that tones cause in the auditory filter centred on `centre`: the power through
/// rounded-exponential weights (1 + p g) exp(-p g), g = |f - fc| / fc (Patterson, Nimmo-Smith,
/// Weber & Milroy 1982), with p = 4 fc / ERB(fc) above the centre and, below it,
/// p - 0.35 (p / p(1 kHz)) (X - 51), X the level within one ERB around the tone (Glasberg & Moore
/// 1990; 0.35 as in Moore, Glasberg & Baer 1997, from memory): loud tones mask upwards. Levels up
/// to 130 dB SPL. No tones: -infinity.
double excitation(Hertz centre, std::span<const AudibleTone> tones);

/// Critical-band rate in Bark: 13 atan(0.76 F) + 3.5 atan((F / 7.5)^2), F in kHz (Zwicker &
/// Terhardt 1980).
double critical_band_rate(Hertz f);

/// How far below the excitation of tones a noise-like sound is still heard: 14.5 + z dB, z in Bark
/// (the tonal end of Johnston, IEEE JSAC 6(2), 1988, from memory; tones mask noise badly, and worse
/// at high frequencies).
double tone_masks_noise_db(Hertz f);

/// Level in dB SPL, within one ERB around `centre`, from which something noise-like is heard beside
/// the tones: their excitation less tone_masks_noise_db(), not below the threshold in quiet.
double masked_threshold(Hertz centre, std::span<const AudibleTone> tones);

}  // namespace kneeprint
