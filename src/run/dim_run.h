// SPDX-License-Identifier: GPL-3.0-or-later
// Recordings of an external generator's DIM signal beside a measurement's own takes.
#pragma once

#include <filesystem>

#include "curve/points.h"
#include "method/dim_recording.h"
#include "print/folder.h"
#include "run/progress.h"

namespace kneeprint {

/// Keeps channel `channel` (from 1) of `recording` among the folder's takes, whole and with its
/// checksum in the journal, so that it can be read again; a later one of the same kind replaces it.
/// Throws InputError: no kneeprint there, no such channel, or what read_dim() refuses; nothing is
/// kept then.
void ingest_dim(const std::filesystem::path& folder, const std::filesystem::path& recording,
                int channel, DimKind kind, Progress& progress);

/// Appends the rows of every kept DIM recording.
void read_dim_takes(const PrintFolder& folder, const Journal& journal, Curves& out);

}  // namespace kneeprint
