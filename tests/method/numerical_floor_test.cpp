// SPDX-License-Identifier: GPL-3.0-or-later
// A straight wire between perfect converters, without noise: what the arithmetic alone reads.
#include <doctest/doctest.h>

#include <cmath>

#include "method/acceptance.h"
#include "method/synthetic.h"
#include "signal/wav.h"
#include "temporary_folder.h"

using namespace kneeprint;
using namespace kneeprint::testing;

namespace {

// Decibels; nothing at all reads as -infinity.
double thd_db(const TakeSpec& spec, const Waveform& take) {
  const LevelPoint p = read(spec, take).levels.at(0);
  return p.thd_f_percent ? 20.0 * std::log10(*p.thd_f_percent / 100.0) : -INFINITY;
}

}  // namespace

TEST_CASE("numerical floor: under -250 dB in memory, under -170 dB from stored takes") {
  TemporaryFolder folder;
  for (const double rate : {44100.0, 96000.0}) {
    for (const double asked : {41.0, 997.0, 1000.0, 4990.0}) {
      for (const double send : {0.0, -40.0}) {
        CAPTURE(rate);
        CAPTURE(asked);
        CAPTURE(send);
        const TakeSpec spec = spec_for("steady", asked, send, Hertz(rate));
        const Waveform take = find_method("steady")->stimulus(spec, Hertz(rate)).wave;
        const double memory = thd_db(spec, take);
        write_wav(folder.path() / "take.wav", {take});
        const double stored = thd_db(spec, read_audio(folder.path() / "take.wav").at(0));
        report(
            fmt::format("numerical floor {:6.0f} Hz at {:6.0f} Hz, {:5.1f} dBFS: {:.1f} dB in "
                        "memory, {:.1f} dB stored",
                        asked, rate, send, memory, stored));
        CHECK(memory < -250.0);
        CHECK(stored < -170.0);
      }
    }
  }
}
