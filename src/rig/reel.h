// SPDX-License-Identifier: GPL-3.0-or-later
// One WAV with every stimulus of a plan, and finding it again in whatever was recorded of it.
//
//   silence  marker  code  stimulus  gap  stimulus  ...  marker  silence
//
// The markers are chirps, one rising and one falling; their two places give where the reel starts
// in the recording and how fast the recorder's clock ran. The code is 32 bits of the plan's
// checksum.
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "quantity/level.h"
#include "signal/waveform.h"

namespace kneeprint {

struct ReelSlot {
  std::size_t start = 0, length = 0;  ///< samples from the reel's beginning
};

struct ReelLayout {
  Hertz rate{48000.0};
  std::size_t start_marker = 0, code = 0, end_marker = 0;  ///< first sample of each
  std::vector<ReelSlot> slots;
  std::size_t length = 0;
};

/// Where everything stands for stimuli of these lengths. `rate`: 8 kHz and more.
ReelLayout lay_out(std::span<const std::size_t> stimulus_lengths, Hertz rate);

/// The reel's samples. Markers and code play at `level`. One stimulus per slot, of the slot's
/// length; else std::invalid_argument (a programming error).
Waveform assemble(const ReelLayout& layout, const std::vector<Waveform>& stimuli,
                  std::uint32_t code, LevelDbfs level);

struct ReelFound {
  double start = 0.0;      ///< sample of the recording at which the reel's sample 0 stands
  double step = 1.0;       ///< samples of the recording per sample of the reel
  double clock_ppm = 0.0;  ///< recorder against reel, beyond the nominal ratio of their rates
  int polarity = 1;        ///< -1 when the markers came back inverted
  double match = 0.0;      ///< likeness of the poorer marker, 0 .. 1
  std::uint32_t code = 0;
};

/// Finds the markers and reads the code. `recording`: any sample rate that holds the markers,
/// silence and noise at either end, any delay and gain, either polarity, a speed off by up to 1 %,
/// flutter of up to 0.2 %. Clean recordings by a steady clock give `start` to 0.02 sample and the
/// length of the reel to 0.02 sample (within that, no drift and no fraction is assumed); flutter
/// moves both markers by its own excursion.
/// Throws InputError, naming `file`: sample rate too low, no start marker, code unreadable or
/// (where `expected_code` is given) of another plan, no end marker, recording ends too early,
/// markers too far apart or too close for this reel.
ReelFound find_reel(const Waveform& recording, const ReelLayout& layout, const std::string& file,
                    std::optional<std::uint32_t> expected_code = {});

/// Throws InputError when the codes differ: the recording is of another plan's reel.
void check_code(const ReelFound& found, std::uint32_t expected, const std::string& file);

/// The response in one slot, in the reel's own time: aligned sample for sample with its stimulus.
/// What the recording no longer holds reads as silence. Tape whose speed wanders leaves a slot away
/// from where the markers' mean speed puts it: where the sound's outline stands off that of
/// `stimulus` by 3 ms to 150 ms, the slot is cut there, by whole samples.
Waveform cut(const Waveform& recording, const ReelFound& found, const ReelLayout& layout,
             const ReelSlot& slot, const Waveform& stimulus);

}  // namespace kneeprint
