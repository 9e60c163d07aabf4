// SPDX-License-Identifier: GPL-3.0-or-later
// Whether a WAV or AIFF file holds the sound that its header promises.
#pragma once

#include <filesystem>

namespace kneeprint {

/// libsndfile quietly shortens a file whose sound chunk promises more bytes than are there; a
/// recording cut short must be told. Throws InputError with bytes promised and found. Reads RIFF
/// and RF64 WAVE, AIFF and AIFF-C (EBU Tech 3306; Apple, "Audio Interchange File Format", 1989;
/// both from memory) and lets every other file pass. A size of 0, or from 0x7F000000 on, means
/// "unknown" in what programs stream into a pipe, and passes too.
void check_chunks_are_whole(const std::filesystem::path& file);

}  // namespace kneeprint
