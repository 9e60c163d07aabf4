// SPDX-License-Identifier: GPL-3.0-or-later
// Audio files by libsndfile.
#pragma once

#include <filesystem>
#include <vector>

#include "signal/waveform.h"

namespace kneeprint {

/// Every channel of a WAV, FLAC, AIFF or other file that libsndfile reads, as doubles with full scale 1.
/// Throws InputError naming the file and what is wrong: missing, not audio, truncated (fewer frames
/// than its header claims), empty, or a sample that is NaN or infinite (names channel and frame).
std::vector<Waveform> read_audio(const std::filesystem::path& file);

/// WAV, 32-bit float, one channel per waveform (same rate and length). Not atomic: print/ renames.
/// The bytes depend on the samples alone (no time stamp). Throws InputError when it cannot be written.
void write_wav(const std::filesystem::path& file, const std::vector<Waveform>& channels);

}  // namespace kneeprint
