// SPDX-License-Identifier: GPL-3.0-or-later
// The takes that all contestants read: one file per workload, written by `bench make`, laid out so
// that C, C++ and numpy read it alike. The header below, one double per take (send level,
// dBFS), then the takes one after another as doubles.
#ifndef KNEEPRINT_BENCH_TAKES_H
#define KNEEPRINT_BENCH_TAKES_H

#include <stdint.h>

typedef struct {
  int64_t takes;
  int64_t frames;   // of each take, ramps and silence included
  int64_t first;    // frame at which the steady part begins
  int64_t hold;     // frames of the steady part: whole cycles of every tone
  int64_t rate;     // Hz
  int64_t cycles1;  // of the (first) tone in the steady part
  int64_t cycles2;  // of the second tone; 0: a single one
  int64_t blocks;   // that Kneeprint divides the steady part into; of a sweep: its repeats
  double start;     // of a sweep: lowest frequency in Hz; 0: no sweep
  double growth;    // of a sweep: seconds in which its frequency grows by e
} TakesHeader;

#endif
