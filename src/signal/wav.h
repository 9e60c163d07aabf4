// SPDX-License-Identifier: GPL-3.0-or-later
// Audio files by libsndfile.
#pragma once

#include <filesystem>
#include <vector>

#include "signal/waveform.h"

namespace kneeprint {

/// Every channel of a WAV, FLAC, AIFF or other file that libsndfile reads, as doubles with full
/// scale 1. Files streamed without a length in their header are read to their end. Throws
/// InputError naming the file and what is wrong: missing, not audio, cut short (less sound than its
/// header promises), empty, or a sample that is NaN or infinite (names channel and frame, from 1
/// and 0).
std::vector<Waveform> read_audio(const std::filesystem::path& file);

/// WAV, 32-bit float, one channel per waveform (same rate and length, at least one; else
/// std::invalid_argument). Not atomic: print/ renames. The bytes depend on the samples alone (no
/// time stamp). Throws InputError when it cannot be written, or would pass the 4 GiB that WAV
/// holds.
void write_wav(const std::filesystem::path& file, const std::vector<Waveform>& channels);

}  // namespace kneeprint
