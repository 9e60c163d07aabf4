// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/swept.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>
#include <string>
#include <vector>

#include "method/synthetic.h"
#include "signal/oversample.h"

using namespace kneeprint;
using kneeprint::testing::read;
using kneeprint::testing::response;
using kneeprint::testing::spec_for;

namespace {

using Complex = std::complex<double>;
constexpr double kDegrees = 180.0 / std::numbers::pi;

// y[n] = b0 x[n] + b1 x[n-1] - a1 y[n-1]: one pole, by the bilinear transform of an RC pair.
struct OnePole {
  double b0 = 1.0, b1 = 0.0, a1 = 0.0;

  static OnePole low_pass(double corner, double rate) {
    const double k = std::tan(std::numbers::pi * corner / rate);
    return {k / (1.0 + k), k / (1.0 + k), (k - 1.0) / (k + 1.0)};
  }
  static OnePole high_pass(double corner, double rate) {
    const double k = std::tan(std::numbers::pi * corner / rate);
    return {1.0 / (1.0 + k), -1.0 / (1.0 + k), (k - 1.0) / (k + 1.0)};
  }
  Complex at(double f, double rate) const {
    const Complex z = std::polar(1.0, -2.0 * std::numbers::pi * f / rate);
    return (b0 + b1 * z) / (1.0 + a1 * z);
  }
  void run(std::vector<double>& x) const {
    double before = 0.0, y = 0.0;
    for (double& v : x) {
      y = b0 * v + b1 * before - a1 * y;
      before = v;
      v = y;
    }
  }
};

// Filters, a curve, filters, run at `factor` times the rate so that no order folds back.
struct Device {
  std::vector<OnePole> pre, post;
  std::function<double(double)> curve;
  int factor = 4;

  Waveform operator()(const Waveform& in) const {
    Interpolator up(factor);
    Decimator down(factor);
    const auto size = in.samples.size();
    const auto fine = static_cast<std::size_t>(factor);
    // Both delays together, rounded up to whole samples of the lower rate.
    const std::size_t delay = up.delay() + down.delay();
    const std::size_t pad = (fine - delay % fine) % fine;
    const std::size_t whole = (delay + pad) / fine;
    std::vector<double> x(in.samples);
    x.resize(size + whole, 0.0);
    std::vector<double> high(x.size() * fine);
    up.process(x, high);
    high.insert(high.begin(), pad, 0.0);
    high.resize(x.size() * fine);
    for (const OnePole& f : pre) f.run(high);
    for (double& v : high) v = curve(v);
    for (const OnePole& f : post) f.run(high);
    down.process(high, x);
    Waveform out{in.rate, {}};
    out.samples.assign(x.begin() + static_cast<long>(whole), x.end());
    return out;
  }
};

Complex product(const std::vector<OnePole>& filters, double f, double rate) {
  Complex h = 1.0;
  for (const OnePole& p : filters) h *= p.at(f, rate);
  return h;
}

// Peak of order n of a curve driven by a cosine of peak `a`: whole periods, 512 points.
double peak_of(const std::function<double(double)>& curve, double a, int n) {
  constexpr int kPoints = 512;
  double sum = 0.0;
  for (int i = 0; i < kPoints; ++i) {
    const double t = 2.0 * std::numbers::pi * i / kPoints;
    sum += curve(a * std::cos(t)) * std::cos(n * t);
  }
  return 2.0 * sum / kPoints;
}

// What a sine of peak `a` and frequency f gives in order n, steadily.
Complex steady_order(const Device& d, double a, double f, int n, double rate) {
  const double high = rate * d.factor;
  const Complex before = product(d.pre, f, high);
  return peak_of(d.curve, a * std::abs(before), n) * std::polar(1.0, n * std::arg(before)) *
         product(d.post, n * f, high);
}

// What the oversampler's ripple (1e-5 dB) and the windows' sidelobes leave without any noise.
constexpr double kOwn = 2e-5;  // dB

struct Worst {
  double db = 0.0, degrees = 0.0;
  double beyond = 0.0;  // the largest error, less kOwn, over its stated 95 %
  int rows = 0;
  double highest = 0.0;
};

double wrapped(double degrees) { return std::remainder(degrees, 360.0); }

Worst compare(const Device& d, const TakeSpec& spec, const Curves& c, int order, double rate) {
  Worst w;
  const double a = sine_peak(spec.send);
  for (const ResponsePoint& p : c.responses) {
    if (p.order != order || p.frequency_hz < 50.0) continue;
    const Complex truth = steady_order(d, a, p.frequency_hz, order, rate);
    const Complex first = steady_order(d, a, p.frequency_hz, 1, rate);
    REQUIRE(p.magnitude_db.has_value());
    REQUIRE(p.phase_deg.has_value());
    const double db = std::abs(*p.magnitude_db - 20.0 * std::log10(std::abs(truth) / a));
    const double phase = order == 1 ? std::arg(truth) : std::arg(truth) - order * std::arg(first);
    w.db = std::max(w.db, db);
    w.degrees = std::max(w.degrees, std::abs(wrapped(*p.phase_deg - kDegrees * phase)));
    w.beyond = std::max(w.beyond, (db - kOwn) / *p.expanded_u_db);
    w.highest = std::max(w.highest, p.frequency_hz * order);
    ++w.rows;
  }
  return w;
}

// The check value's polynomial: a = (0, 1, 0.1, -0.05, 0.02, 0.01), drive 0.8.
double polynomial(double x) { return x * (1.0 + x * (0.1 + x * (-0.05 + x * (0.02 + x * 0.01)))); }
const double kDrive = 20.0 * std::log10(0.8);

TakeSpec sweep_spec(double send_dbfs, Hertz rate, double seconds = 5.0, int orders = 5) {
  TakeSpec spec = spec_for("sweep", 0.0, send_dbfs, rate);
  spec.options.duration = Seconds(seconds);
  spec.settings.orders = orders;
  return spec;
}

Waveform played(const TakeSpec& spec, Hertz rate) {
  return find_method(spec.method)->stimulus(spec, rate).wave;
}

const ResponsePoint& row_at(const Curves& c, int order, double f) {
  return *std::find_if(c.responses.begin(), c.responses.end(), [&](const ResponsePoint& p) {
    return p.order == order && std::abs(p.frequency_hz - f) < 1e-6 * f;
  });
}

// Cubic through the four rows around f, over the logarithm of frequency (Lagrange). The error is of
// the fourth power of a twelfth of an octave.
double between(const Curves& c, int order, double f, bool phase) {
  std::vector<const ResponsePoint*> rows;
  for (const ResponsePoint& p : c.responses) {
    if (p.order == order) rows.push_back(&p);
  }
  std::size_t above = 0;
  while (rows[above]->frequency_hz < f) ++above;
  const std::size_t first = std::clamp<std::size_t>(above - 2, 0, rows.size() - 4);
  const double reference = *rows[first]->phase_deg;
  double sum = 0.0;
  for (std::size_t i = first; i < first + 4; ++i) {
    double weight = 1.0;
    for (std::size_t j = first; j < first + 4; ++j) {
      if (j == i) continue;
      weight *= std::log(f / rows[j]->frequency_hz) /
                std::log(rows[i]->frequency_hz / rows[j]->frequency_hz);
    }
    sum += weight *
           (phase ? reference + wrapped(*rows[i]->phase_deg - reference) : *rows[i]->magnitude_db);
  }
  return sum;
}

}  // namespace

TEST_CASE("a static curve: the check values and every row, H1 to H5, up to 0.44 of the rate") {
  const Hertz rate(48000.0);
  const TakeSpec spec = sweep_spec(kDrive, rate);
  // Exact decimals by expanding cos^n: b = 0, then b = 0.3.
  const double expected[2][5] = {{0.782848, 0.036096, -0.005376, 0.001024, 0.0002048},
                                 {0.834772, 0.029088, -0.001152, 0.001792, 0.0002048}};
  for (const bool biased : {false, true}) {
    const double bias = biased ? 0.3 : 0.0;
    const Device d{{}, {}, [=](double x) { return polynomial(x + bias) - polynomial(bias); }};
    TakeVerdict verdict;
    const Curves c = read(spec, d(played(spec, rate)), {}, &verdict);
    CHECK(verdict.settled);
    CHECK_FALSE(verdict.clipped);
    for (int n = 1; n <= 5; ++n) {
      CAPTURE(n);
      const ResponsePoint& p = row_at(c, n, 1000.0);
      const double peak = expected[biased ? 1 : 0][n - 1];
      // Asked for: 0.01 dB and 0.1 degree; a static curve leaves much less.
      CHECK(std::abs(*p.magnitude_db - 20.0 * std::log10(std::abs(peak) / 0.8)) < kOwn);
      CHECK(std::abs(wrapped(*p.phase_deg - (peak < 0.0 ? 180.0 : 0.0))) < 1e-3);
      const Worst w = compare(d, spec, c, n, rate.value());
      CHECK(w.db < kOwn);
      CHECK(w.degrees < 1e-3);
      CHECK(w.rows > 75);
      CHECK(w.highest > 0.44 * rate.value());
      // The lowest row, at 49.6 Hz, is the nearest to the sweep's rise, whose edge shows most
      // there.
      const ResponsePoint& first = row_at(c, n, swept_fundamentals(rate).front().value());
      CHECK(std::abs(*first.magnitude_db - 20.0 * std::log10(std::abs(peak) / 0.8)) < 1e-4);
      CHECK(std::abs(wrapped(*first.phase_deg - (peak < 0.0 ? 180.0 : 0.0))) < 1e-2);
    }
  }
}

TEST_CASE("tanh with a bias: ten orders, absent ones not made up") {
  const Hertz rate(16000.0);
  const TakeSpec spec = sweep_spec(-2.0, rate, 5.0, 10);
  const Device d{{}, {}, [](double x) { return std::tanh(1.5 * x + 0.3) - std::tanh(0.3); }, 16};
  const Curves c = read(spec, d(played(spec, rate)));
  for (int n = 1; n <= 10; ++n) {
    CAPTURE(n);
    const Worst w = compare(d, spec, c, n, rate.value());
    CHECK(w.db < 1e-3);
    CHECK(w.degrees < 1e-2);
    CHECK(w.rows > 20);
  }
  // A square law has two orders: what the others' windows let through is rounding.
  const Device square{{}, {}, [](double x) { return x + 0.2 * x * x; }};
  const Curves s = read(spec, square(played(spec, rate)));
  for (const ResponsePoint& p : s.responses) {
    if (p.order > 2 && p.magnitude_db) CHECK(*p.magnitude_db < -130.0);
  }
}

TEST_CASE("filters before and after the curve: as steady, and within the stated uncertainty") {
  const Hertz rate(48000.0);
  const double high = 4.0 * rate.value();
  const TakeSpec spec = sweep_spec(kDrive, rate, 10.0);
  const Device d{{OnePole::high_pass(5.0, high), OnePole::low_pass(30000.0, high)},
                 {OnePole::high_pass(3.0, high), OnePole::low_pass(25000.0, high)},
                 polynomial};
  TakeVerdict verdict;
  const Curves c = read(spec, d(played(spec, rate)), {}, &verdict);
  CHECK(verdict.settled);
  for (int n = 1; n <= 5; ++n) {
    CAPTURE(n);
    const Worst w = compare(d, spec, c, n, rate.value());
    CHECK(w.db < 0.01);
    CHECK(w.degrees < 0.1);
    CHECK(w.beyond < 1.0);
    CHECK(w.highest > 0.44 * rate.value());
  }
  // The same device by the steady method, at frequencies between the rows.
  for (const double asked : {61.0, 997.0, 4990.0, 9500.0, 20000.0}) {
    TakeSpec steady = spec_for("steady", asked, kDrive, rate);
    steady.settings.orders = 5;
    // The couplings' transients have to be gone below the fifth order, 72 dB down.
    steady.settings.wanted_uncertainty = Decibels(1e-6);
    steady.hold_blocks = 8;
    const Curves s = read(steady, d(played(steady, rate)));
    for (const ResponsePoint& p : s.responses) {
      if (p.flag == Flag::alias) continue;
      CAPTURE(asked);
      CAPTURE(p.order);
      CHECK(std::abs(between(c, p.order, p.frequency_hz, false) - *p.magnitude_db) < 0.01);
      CHECK(std::abs(wrapped(between(c, p.order, p.frequency_hz, true) - *p.phase_deg)) < 0.1);
    }
  }
}

TEST_CASE(
    "a filter before the curve that answers a sweep otherwise than a tone: covered, shrinking") {
  const Hertz rate(16000.0);
  const double high = 4.0 * rate.value();
  // Steep at the rows' lowest frequencies: the sweep's speed shows in a hundredth of a dB and more.
  const Device d{{OnePole::high_pass(20.0, high)}, {}, polynomial};
  double before = 0.0;
  for (const double seconds : {5.0, 10.0}) {
    const TakeSpec spec = sweep_spec(kDrive, rate, seconds);
    const Curves c = read(spec, d(played(spec, rate)));
    for (int n = 1; n <= 5; ++n) CHECK(compare(d, spec, c, n, rate.value()).beyond < 1.0);
    const double fifth = compare(d, spec, c, 5, rate.value()).db;
    if (seconds == 5.0) CHECK(fifth > 0.01);
    if (seconds == 10.0) CHECK(fifth == doctest::Approx(before / 2.0).epsilon(0.05));
    before = fifth;
  }
}

TEST_CASE("a delay bends nothing, and adds nothing to the uncertainty") {
  const Hertz rate(16000.0);
  const TakeSpec spec = sweep_spec(kDrive, rate);
  Waveform late = Device{{}, {}, polynomial}(played(spec, rate));
  late.samples.insert(late.samples.begin(), 12, 0.0);
  late.samples.resize(late.samples.size() - 12);
  const Curves c = read(spec, late);
  for (const ResponsePoint& p : c.responses) {
    // Nearer to the sweep's beginning, what is left of its rise looks like a bend.
    if (p.frequency_hz > 60.0) CHECK(*p.expanded_u_db < 1e-4);
  }
  const double turns = 12.0 / 16000.0 * row_at(c, 1, 1000.0).frequency_hz;
  CHECK(std::abs(wrapped(*row_at(c, 1, 1000.0).phase_deg + 360.0 * turns)) < 1e-3);
  CHECK(std::abs(wrapped(*row_at(c, 2, 1000.0).phase_deg)) < 1e-3);
  // Told of the delay, the reading takes it out.
  Curves told;
  find_method("sweep")->read(spec, {late, nullptr, 12.0}, {}, told);
  CHECK(std::abs(wrapped(*row_at(told, 1, 1000.0).phase_deg)) < 1e-3);
}

TEST_CASE("noise: the stated intervals hold, and are no wider than they must be") {
  const Hertz rate(16000.0);
  const TakeSpec spec = sweep_spec(kDrive, rate, 4.0, 6);
  const Device d{{}, {}, polynomial};
  const Waveform clean = d(played(spec, rate));
  constexpr int kRuns = 60;
  constexpr double kSigma = 3e-5;
  std::mt19937_64 random(20);
  std::normal_distribution<double> noise(0.0, kSigma);
  int covered = 0, figures = 0, limits = 0, absent = 0;
  double squares = 0.0;
  for (int run = 0; run < kRuns; ++run) {
    Waveform take = clean;
    for (double& x : take.samples) x += noise(random);
    TakeVerdict verdict;
    const Curves c = read(spec, take, {}, &verdict);
    CHECK(verdict.settled);
    for (const ResponsePoint& p : c.responses) {
      // Every sixth row: neighbours share some of their noise, half octaves do not.
      const long step = std::lround(12.0 * std::log2(p.frequency_hz / 1000.0));
      if (step % 6 != 0 || p.frequency_hz < 60.0) continue;
      if (p.order == 6) {  // there is none
        ++absent;
        limits += p.flag == Flag::noise;
        continue;
      }
      const double a = sine_peak(spec.send);
      const double truth =
          20.0 * std::log10(std::abs(steady_order(d, a, p.frequency_hz, p.order, 16000.0)) / a);
      REQUIRE(p.flag == Flag::none);
      REQUIRE(*p.expanded_u_db < 1.0);  // else decibels are no longer linear
      const double error = (*p.magnitude_db - truth) / *p.expanded_u_db;
      ++figures;
      covered += std::abs(error) <= 1.0;
      squares += error * error;
    }
  }
  // 95 % of 3420 within four and a half binomial deviations (some rows share the estimate of their
  // noise): a right reading fails in fewer than one of 10^5 seeds.
  CHECK(figures == kRuns * 57);
  CHECK(std::abs(covered - 0.95 * figures) < 4.5 * std::sqrt(0.95 * 0.05 * figures));
  // (error / (k u))^2 has the mean 1 / k^2; k lies between 1.96 and 2.06 (38 degrees of freedom and
  // more).
  CHECK(squares / figures == doctest::Approx(0.25).epsilon(0.1));
  // What is not there passes the 95 % limit in 5 % of 540 rows.
  CHECK(std::abs(limits - 0.95 * absent) < 4.5 * std::sqrt(0.95 * 0.05 * absent));
}

TEST_CASE("under the noise a row is an upper limit, above the truth in 95 % of cases") {
  const Hertz rate(16000.0);
  const TakeSpec spec = sweep_spec(-20.0, rate, 4.0, 2);
  const Waveform sent = played(spec, rate);
  std::mt19937_64 random(3);
  std::normal_distribution<double> noise(0.0, 1e-4);
  // Order 2 of the size of its noise: a2 A / 2 of the fundamental.
  constexpr double kSquare = 3e-3;
  const double truth = 20.0 * std::log10(kSquare * sine_peak(spec.send) / 2.0);
  int rows = 0, limits = 0, too_low = 0;
  for (int run = 0; run < 20; ++run) {
    Waveform take = sent;
    for (double& x : take.samples) x += kSquare * x * x + noise(random);
    for (const ResponsePoint& p : read(spec, take).responses) {
      const long step = std::lround(12.0 * std::log2(p.frequency_hz / 1000.0));
      if (p.order != 2 || step % 3 != 0) continue;
      ++rows;
      if (p.flag != Flag::noise) continue;
      ++limits;
      CHECK_FALSE(p.phase_deg.has_value());
      too_low += *p.magnitude_db < truth;
    }
  }
  CHECK(limits > rows / 4);
  CHECK(limits < rows);
  // At most 5 % of all rows, with four and a half binomial deviations.
  CHECK(too_low < 0.05 * rows + 4.5 * std::sqrt(0.05 * 0.95 * rows));
}

TEST_CASE("drift of a unit: the first repeat is left out, what goes on is unsteady") {
  const Hertz rate(16000.0);
  const TakeSpec spec = sweep_spec(-12.0, rate, 4.0, 3);
  const Stimulus s = find_method("sweep")->stimulus(spec, rate);
  const auto curve = [](double x) { return x + 0.1 * x * x; };
  const auto with_gains = [&](double first, double second, double third) {
    Waveform w = s.wave;
    for (std::size_t n = 0; n < w.samples.size(); ++n) {
      const std::size_t block =
          (std::max(n, s.hold.first_block) - s.hold.first_block) / s.hold.block;
      w.samples[n] = (block == 0 ? first : block == 1 ? second : third) * curve(w.samples[n]);
    }
    return w;
  };
  TakeVerdict verdict;
  // 0.09 dB in the first repeat alone: the others tell the truth.
  Curves c = read(spec, with_gains(1.01, 1.0, 1.0), {}, &verdict);
  CHECK(verdict.settled);
  CHECK(std::abs(*row_at(c, 1, 1000.0).magnitude_db) < 1e-4);
  // Going on: flagged, and the change is in the uncertainty.
  c = read(spec, with_gains(1.01, 1.0, 0.99), {}, &verdict);
  CHECK_FALSE(verdict.settled);
  CHECK(row_at(c, 1, 1000.0).flag == Flag::unsteady);
  CHECK(row_at(c, 2, 1000.0).flag == Flag::unsteady);
  // A standard deviation of 1 % over three repeats: 0.05 dB for the mean.
  CHECK(*row_at(c, 1, 1000.0).expanded_u_db > 0.05);
  // Less than the wanted 0.01 dB: settled, but not hidden.
  c = read(spec, with_gains(1.0003, 1.0, 0.9997), {}, &verdict);
  CHECK(verdict.settled);
  CHECK(row_at(c, 1, 1000.0).flag == Flag::none);
  CHECK(*row_at(c, 1, 1000.0).expanded_u_db > 0.0015);
}

TEST_CASE("scales, drive and a reference return") {
  RigView rig;
  rig.send = LevelScale::calibrated(to_volts(LevelDbu(24.0)), Decibels(0.02));
  rig.ret = LevelScale::calibrated(to_volts(LevelDbu(18.0)), Decibels(0.03));
  const Hertz rate(16000.0);
  const TakeSpec spec = sweep_spec(-20.0, rate, 4.0, 2);
  const Waveform sent = played(spec, rate);
  Waveform take = sent, reference = sent;
  for (double& x : take.samples) x *= -2.0;
  Curves c = read(spec, take, rig);
  // -20 dBFS send = +4 dBu; return -13.98 dBFS = +4.02 dBu.
  const ResponsePoint& p = row_at(c, 1, 1000.0);
  CHECK(p.method == "sweep");
  CHECK(p.unit == LevelUnit::dbu);
  CHECK(p.drive == doctest::Approx(4.0));
  CHECK(*p.magnitude_db == doctest::Approx(20.0 * std::log10(2.0) - 6.0).epsilon(1e-5));
  CHECK(std::abs(*p.phase_deg) == doctest::Approx(180.0).epsilon(1e-6));
  CHECK(*p.expanded_u_db == doctest::Approx(1.96 * std::hypot(0.02, 0.03)).epsilon(1e-3));
  // A reference 3 dB lower, three samples late: drive and input are its own.
  for (std::size_t n = reference.samples.size(); n-- > 0;) {
    reference.samples[n] = n < 3 ? 0.0 : std::sqrt(0.5) * sent.samples[n - 3];
  }
  Curves referred;
  find_method("sweep")->read(spec, {take, &reference}, rig, referred);
  const ResponsePoint& q = row_at(referred, 1, 1000.0);
  CHECK(q.drive == doctest::Approx(18.0 - 20.0 - 3.0103).epsilon(1e-5));
  CHECK(*q.magnitude_db == doctest::Approx(20.0 * std::log10(2.0) + 3.0103).epsilon(1e-5));
  CHECK(std::abs(wrapped(*q.phase_deg - 180.0 - 3.0 / 16.0 * 360.0)) < 1e-3);
  // A reel without levels: phases, but no gain.
  rig.gain_known = false;
  c = read(spec, take, rig);
  CHECK_FALSE(row_at(c, 1, 1000.0).magnitude_db.has_value());
  CHECK(row_at(c, 1, 1000.0).phase_deg.has_value());
}

TEST_CASE("the rig's own response is taken out, as for steady sines") {
  const Hertz rate(48000.0);
  const double high = 4.0 * rate.value();
  // The send loses a little above, the return below and above; the unit is a static curve.
  const std::vector<OnePole> send{OnePole::low_pass(60000.0, high)};
  const std::vector<OnePole> ret{OnePole::high_pass(1.0, high), OnePole::low_pass(60000.0, high)};
  const Device d{send, ret, polynomial};
  std::vector<LoopPoint> points;
  for (double f = 20.0; f < 24000.0; f *= std::exp2(1.0 / 48.0)) {
    const Complex h = product(send, f, high) * product(ret, f, high);
    points.push_back({Hertz(f), Decibels::of_ratio(std::abs(h)), kDegrees * std::arg(h)});
  }
  RigView rig;
  rig.response = LoopResponse(points);
  const TakeSpec spec = sweep_spec(kDrive, rate);
  const Curves c = read(spec, d(played(spec, rate)), rig);
  const Device bare{{}, {}, polynomial};
  for (int n = 1; n <= 5; ++n) {
    CAPTURE(n);
    // The shares are not equal halves, which the split's term covers; beside it stand 2e-4 dB for
    // the table's interpolation.
    for (const ResponsePoint& p : c.responses) {
      if (p.order != n || p.frequency_hz < 50.0) continue;
      const double a = 0.8 * std::abs(product(send, p.frequency_hz, high));  // as driven
      const double truth =
          20.0 * std::log10(std::abs(steady_order(bare, a, p.frequency_hz, n, 48000.0)) / a);
      CHECK(std::abs(*p.magnitude_db - truth) < 2e-4 + *p.expanded_u_db);
    }
    TakeSpec steady = spec_for("steady", 4990.0, kDrive, rate);
    steady.settings.wanted_uncertainty = Decibels(1e-6);
    steady.hold_blocks = 8;
    const Curves s = read(steady, d(played(steady, rate)), rig);
    const ResponsePoint& p = s.responses[static_cast<std::size_t>(n - 1)];
    if (p.flag == Flag::alias) continue;
    CHECK(std::abs(between(c, n, p.frequency_hz, false) - *p.magnitude_db) < 0.01);
    CHECK(std::abs(wrapped(between(c, n, p.frequency_hz, true) - *p.phase_deg)) < 0.1);
  }
}

TEST_CASE("the rig floor widens the uncertainty and flags what stands on it") {
  const Hertz rate(16000.0);
  const TakeSpec spec = sweep_spec(-12.0, rate, 4.0, 3);
  Waveform take = played(spec, rate);
  const double a = sine_peak(spec.send);
  // Orders 2 and 3 at -60 and -100 dB of the fundamental.
  for (double& x : take.samples) x += 2e-3 / a * x * x + 4e-5 / (a * a) * x * x * x;
  RigView rig;
  std::vector<FloorPoint> points;
  for (const int order : {2, 3}) {
    for (const double level : {-40.0, 0.0}) {
      points.push_back({LevelDbfs(level), order, Decibels(-96.0)});
    }
  }
  rig.floor = RigFloor(points);
  const Curves c = read(spec, take, rig);
  CHECK(row_at(c, 1, 1000.0).flag == Flag::none);
  CHECK(row_at(c, 2, 1000.0).flag == Flag::none);
  CHECK(row_at(c, 3, 1000.0).flag == Flag::floor);
  // Send and return at -96 dB each, on -60 dB: -30 dB, known amplitude, unknown phase.
  const double ratio = 2.0 * std::pow(10.0, -96.0 / 20.0) / 1e-3;
  CHECK(*row_at(c, 2, 1000.0).expanded_u_db ==
        doctest::Approx(1.96 * 8.6859 * ratio / std::sqrt(2.0)).epsilon(0.01));
}

TEST_CASE("clipped, silent and short-sighted rigs are told, without a crash or a NaN") {
  const Hertz rate(16000.0);
  TakeSpec spec = sweep_spec(0.0, rate, 4.0, 4);
  const Waveform sent = played(spec, rate);
  Waveform take = sent;
  for (double& x : take.samples) x = std::clamp(1.5 * x, -1.0, 1.0);
  TakeVerdict verdict;
  Curves c = read(spec, take, {}, &verdict);
  CHECK(verdict.clipped);
  CHECK(row_at(c, 3, 1000.0).flag == Flag::clipped);

  for (const double sigma : {0.0, 1e-5}) {
    std::mt19937_64 random(9);
    std::normal_distribution<double> noise(0.0, 1.0);
    for (double& x : take.samples) x = sigma * noise(random);
    Curves silent;
    find_method("sweep")->read(spec, {take, &take}, {}, silent);
    CHECK_FALSE(silent.responses.empty());
    int seen = 0;
    for (const ResponsePoint& p : silent.responses) {
      seen += p.flag != Flag::noise;
      for (const Cell& cell : {p.magnitude_db, p.phase_deg, p.expanded_u_db}) {
        if (cell) CHECK(std::isfinite(*cell));
      }
    }
    CHECK(seen < 0.1 * static_cast<double>(silent.responses.size()));
  }

  // A recording at half the rate shows half of it.
  RigView rig;
  rig.recorded_rate = Hertz(8000.0);
  c = read(spec, sent, rig);
  for (const ResponsePoint& p : c.responses) CHECK(p.order * p.frequency_hz < 0.45 * 8000.0);

  // A wire, also as stored in 32 bits.
  take = sent;
  for (double& x : take.samples) x = static_cast<double>(static_cast<float>(x));
  for (const ResponsePoint& p : read(spec, take).responses) {
    if (p.order == 1) CHECK(std::abs(*p.magnitude_db) < 1e-4);
    if (p.order > 1 && p.magnitude_db) CHECK(*p.magnitude_db < -130.0);
  }
}

TEST_CASE("the stimulus: a slow rise, repeats, no mains period, the length that was asked for") {
  for (const double rate : {44100.0, 48000.0, 96000.0}) {
    for (const double seconds : {0.5, 5.0}) {
      CAPTURE(rate);
      CAPTURE(seconds);
      const TakeSpec spec = sweep_spec(-6.0, Hertz(rate), seconds);
      const Stimulus s = find_method("sweep")->stimulus(spec, Hertz(rate));
      CHECK(s.hold.blocks == 3);
      const double block = static_cast<double>(s.hold.block) / rate;
      CHECK(find_method("sweep")->block_length(spec, Hertz(rate)).value() ==
            doctest::Approx(block).epsilon(1e-12));
      // At least 4 s, with a gap of 0.2 s, at most a quarter more for a fast transform.
      CHECK(block >= std::max(4.0, seconds) + 0.2);
      CHECK(block < 1.25 * (std::max(4.0, seconds) + 0.2) + 0.1);
      for (const double mains : {50.0, 60.0}) {
        CHECK(std::abs(std::remainder(mains * block, 1.0)) >= 0.15);
      }
      // From silence to full level in four periods of its lowest tone or more.
      double turns = 0.0;
      std::size_t n = s.hold.first_block;
      for (; std::abs(s.wave.samples[n]) < 0.995 * sine_peak(spec.send); ++n) {
        turns += s.wave.samples[n] < 0.0 && s.wave.samples[n + 1] >= 0.0;
      }
      CHECK(turns >= 4.0);
      CHECK(static_cast<double>(n - s.hold.first_block) / rate > 0.02);
    }
  }
  const auto f = swept_fundamentals(Hertz(48000.0));
  CHECK(f.front().value() == doctest::Approx(1000.0 * std::exp2(-52.0 / 12.0)));
  CHECK(f.back().value() < 0.45 * 48000.0);
  CHECK(f.back().value() * std::exp2(1.0 / 12.0) >= 0.45 * 48000.0);
}
