// SPDX-License-Identifier: GPL-3.0-or-later
// The page's fixed texts: definitions, cautions, glossary.
#include "report/report_sections.h"

namespace kneeprint {

Section definitions_section() {
  Definitions d;
  d.entries = {
      {"drive",
       "The voltage across the unit's input terminals with the unit connected, rms of a sine; for "
       "any other stimulus, rms of the sine with the same peak."},
      {"dBu, dBFS", "0 dBu is 0.7746 V rms. A full-scale sine is 0 dBFS (AES17)."},
      {"THD_F",
       "Root sum of squares of H2 to the last order that fits below 20 kHz and 0.45 of the sample "
       "rate, over the fundamental. The last order stands with each figure. Orders under the noise "
       "widen the uncertainty and stay out of the value."},
      {"THD_R", "The same sum over fundamental and harmonics together: THD_F / sqrt(1 + THD_F²)."},
      {"THD+N",
       "The rms of everything from 20 Hz to 20 kHz but the fundamental, over the total rms in that "
       "band. The notch is the least-squares fundamental, nothing else is taken out (as in AES17, "
       "with an ideal notch). SINAD: the fundamental over that rest."},
      {"noise",
       "Level of what is neither DC nor fundamental nor harmonic, 20 Hz to 20 kHz, unweighted."},
      {"phase of order n",
       "Cosine reference, minus n times the phase of the fundamental at the output; an inverting "
       "unit's response is negated first. A memoryless curve gives 0 or 180 degrees."},
      {"even/odd", "20 log10 of the root sum of squares of H2, H4, ... over that of H3, H5, ..."},
      {"compression",
       "Fall of the gain against the gain at the named reference rung, the lowest usable one."},
      {"modulation distortion",
       "60 Hz and 7 kHz, 4:1: m2 and m3 are the arithmetic sums of the sideband pairs f2 ± f1 and "
       "f2 ± 2 f1 over f2; total is the root sum of their squares (IEC 60268-3)."},
      {"difference-frequency distortion",
       "19 and 20 kHz, 1:1: d2 is the product f2 − f1, d3 the arithmetic sum of 2 f1 − f2 and 2 f2 "
       "− f1, over the arithmetic sum of both tones; total is the root sum of their squares (IEC "
       "60268-3)."},
      {"uncertainty",
       "± is the expanded uncertainty at 95 %: the combined standard uncertainty times Student's t "
       "for its degrees of freedom (GUM, JCGM 100). It holds the scatter of the blocks, the rig "
       "floor as a term of known size and unknown phase, and for levels the calibration. Setting "
       "up again is not in it: repeatability only."},
      {"multitone",
       "31 tones with the sine's peak. Distortion is what repeats from block to block and is no "
       "tone; products of even and of odd order fall on different bins. Fill: the share of bands "
       "of "
       "1 ERB whose distortion stands above the threshold that the tones mask, by a simple model."},
      {"noise and hum",
       "At rest, and with a low tone that keeps the unit at work; 20 Hz to 20 kHz, unweighted, "
       "A-weighted (IEC 61672-1), quasi-peak (ITU-R BS.468-4); lines at mains multiples apart."},
      {"floor", "Flag: at or under the rig floor, what a cable in place of the unit shows."},
      {"noise (flag)", "Under the noise at this integration time: an upper limit, not a value."},
      {"alias", "Flag: beyond what the sample rate can show."},
      {"clipped", "Flag: the rig, not the unit, clipped."},
      {"unsteady", "Flag: the unit had not settled within the plan's time."},
      {"AICc",
       "Akaike's information criterion for small samples, with the discrepancy in its likelihood."},
  };
  return {"Definitions", {d}};
}

Section cautions_section() {
  return {
      "Cautions",
      {Paragraph{"Hearing and loudspeakers: turn monitors and headphones down or off before "
                 "anything is played; a ladder ends far above its start."},
       Paragraph{"Valve equipment holds lethal voltages, also after it is switched off and "
                 "unplugged. Work inside it only if you are qualified to."},
       Paragraph{"Never lift the protective earth of any device, whatever hums. Equipment with a "
                 "live chassis: only behind an isolating transformer, and by a qualified person."},
       Paragraph{"Never run a valve power amplifier without its load."},
       Paragraph{"Meter the unit's output for DC before patching, and switch units on and off with "
                 "the send unpatched. A return may be destroyed by levels beyond its rating."},
       Paragraph{"Local electrical codes and a qualified person's advice go before anything said "
                 "here."}}};
}

Section glossary_section() {
  Definitions d;
  d.entries = {
      {"kneeprint", "The print of how the unit's transfer curve bends: this folder."},
      {"unit", "The equipment being measured."},
      {"rig", "Everything else: converters, cables, their levels, noise and residual distortion."},
      {"rig floor", "What the rig alone shows at the same levels, a cable in place of the unit."},
      {"ladder, rung", "The ascending list of drives; one of them."},
      {"take", "One recorded response to one stimulus at one drive."},
      {"reel",
       "One recording that holds every stimulus of a plan, for equipment that cannot be measured "
       "live."},
      {"guard", "Our last stage before the converter: ceilings, ramps, mute; no shield electrode."},
      {"limit, drive, bias, sharpness",
       "The parameters of the fitted sigmoid; drive there is the gain into it, not a level."},
      {"hold-out", "Data not used in the fit, on which it is then judged."},
  };
  return {"Glossary", {d}};
}

}  // namespace kneeprint
