// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/dim_run.h"

#include <doctest/doctest.h>

#include <algorithm>

#include "curve/csv.h"
#include "method/dim_generator.h"
#include "quantity/failure.h"
#include "rig/rig_file.h"
#include "run/publish.h"
#include "signal/wav.h"
#include "temporary_folder.h"

using namespace kneeprint;

namespace {

const ScalarPoint* row(const Curves& c, const std::string& method) {
  const auto it = std::find_if(c.scalars.begin(), c.scalars.end(), [&](const ScalarPoint& s) {
    return s.method == method && s.figure == "dim";
  });
  return it == c.scalars.end() ? nullptr : &*it;
}

}  // namespace

TEST_CASE("a DIM recording is kept with its checksum and read again; a later one replaces it") {
  testing::TemporaryFolder temporary;
  PrintFolder folder(temporary.path() / "print");
  Plan plan;
  plan.name = "test";
  plan.steps = {{"steady", {Hertz(997.0)}}};
  Rig rig;
  rig.kind = RigKind::reel;
  const auto file = temporary.path() / "dim.wav";
  SilentProgress progress;
  testing::DimGenerator g;
  g.seconds = 2.7;
  g.products[4] = 1e-3;
  const Waveform signal = g.at(Hertz(48000.0));
  const Waveform silent{signal.rate, std::vector<double>(signal.samples.size(), 0.0)};
  write_wav(file, {silent, signal});
  CHECK_THROWS_AS(ingest_dim(folder.path(), file, 2, DimKind::dim30, progress), InputError);

  folder.begin(plan_json(plan), rig_json(rig), {"unit", 1, "now", "kneeprint"});
  CHECK_THROWS_AS(ingest_dim(folder.path(), file, 3, DimKind::dim30, progress), InputError);
  CHECK_THROWS_AS(ingest_dim(folder.path(), file, 1, DimKind::dim30, progress), InputError);
  CHECK(read_journal(folder.journal_file(), false).takes.empty());

  ingest_dim(folder.path(), file, 2, DimKind::dim30, progress);
  CHECK(analyse_folder(folder.path()) == 0);  // no take of the ladder
  Curves curves = read_curves(folder.curves());
  REQUIRE(row(curves, "dim-30") != nullptr);
  // float32: rounding of 6e-8 spread over the band stays under 1e-8 of the sine in a line.
  CHECK(*row(curves, "dim-30")->value == doctest::Approx(0.1).epsilon(1e-4));
  CHECK(row(curves, "dim-100") == nullptr);

  g.products[4] = 2e-3;
  write_wav(file, {g.at(Hertz(44100.0))});  // another rate than the rig's
  ingest_dim(folder.path(), file, 1, DimKind::dim30, progress);
  ingest_dim(folder.path(), file, 1, DimKind::dim100, progress);
  analyse_folder(folder.path());
  curves = read_curves(folder.curves());
  CHECK(*row(curves, "dim-30")->value == doctest::Approx(0.2).epsilon(1e-4));
  CHECK(*row(curves, "dim-100")->value == doctest::Approx(0.2).epsilon(1e-4));
  CHECK(std::count_if(curves.scalars.begin(), curves.scalars.end(),
                      [](const ScalarPoint& s) { return s.figure == "dim"; }) == 2);
}
