// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/wav.h"

#include <doctest/doctest.h>
#include <sndfile.h>

#include <algorithm>
#include <cmath>
#include <cstring>
#include <limits>
#include <string>

#include "quantity/failure.h"
#include "temporary_folder.h"

namespace kneeprint {
namespace {

using testing::bytes_of;
using testing::TemporaryFolder;
using testing::write_bytes;

Waveform ramp(std::size_t frames, double rate = 48000.0) {
  Waveform w{Hertz(rate), std::vector<double>(frames)};
  for (std::size_t n = 0; n < frames; ++n)
    w.samples[n] = 0.9 * std::sin(0.37 * static_cast<double>(n));
  return w;
}

// Written by libsndfile itself in any of its formats, mono.
void write_as(const std::filesystem::path& file, int format, const Waveform& w) {
  SF_INFO info{};
  info.samplerate = static_cast<int>(w.rate.value());
  info.channels = 1;
  info.format = format;
  SNDFILE* sound = sf_open(file.string().c_str(), SFM_WRITE, &info);
  REQUIRE(sound != nullptr);
  const auto frames = static_cast<sf_count_t>(w.samples.size());
  CHECK(sf_writef_double(sound, w.samples.data(), frames) == frames);
  sf_close(sound);
}

std::string refusal(const std::filesystem::path& file) {
  try {
    read_audio(file);
  } catch (const InputError& e) {
    const std::string sentence = e.what();
    CHECK(sentence.starts_with(file.string() + ": "));
    return sentence;
  }
  return "(accepted)";
}

bool says(const std::string& sentence, const std::string& words) {
  return sentence.find(words) != std::string::npos;
}

}  // namespace

TEST_CASE("what is written comes back: channels, rate, and every sample as a 32-bit float") {
  const TemporaryFolder folder;
  const auto file = folder.path() / "two.wav";
  Waveform left = ramp(70001, 192000.0), right = left;  // more than one block
  std::ranges::reverse(right.samples);
  right.samples[5] = 1.75;  // beyond full scale is kept
  write_wav(file, {left, right});
  const std::vector<Waveform> back = read_audio(file);
  REQUIRE(back.size() == 2);
  CHECK(back[0].rate == Hertz(192000.0));
  REQUIRE(back[0].samples.size() == 70001);
  for (std::size_t n = 0; n < 70001; ++n) {
    if (back[0].samples[n] != static_cast<float>(left.samples[n])) CHECK(n == 70001);
    if (back[1].samples[n] != static_cast<float>(right.samples[n])) CHECK(n == 70001);
  }
}

TEST_CASE("the bytes depend on the samples alone") {
  const TemporaryFolder folder;
  write_wav(folder.path() / "a.wav", {ramp(1000)});
  write_wav(folder.path() / "b.wav", {ramp(1000)});
  const std::string bytes = bytes_of(folder.path() / "a.wav");
  CHECK(bytes == bytes_of(folder.path() / "b.wav"));
  CHECK(!says(bytes, "PEAK"));  // the chunk with the time of writing
}

TEST_CASE("integer and float files of every kind in use are read to their own precision") {
  const TemporaryFolder folder;
  const Waveform w = ramp(5000, 44100.0);
  const struct {
    const char* name;
    int format;
    double step;  // of one code
  } kinds[] = {{"16.wav", SF_FORMAT_WAV | SF_FORMAT_PCM_16, 0x1p-15},
               {"24.wav", SF_FORMAT_WAV | SF_FORMAT_PCM_24, 0x1p-23},
               {"32.wav", SF_FORMAT_WAV | SF_FORMAT_PCM_32, 0x1p-31},
               {"f.wav", SF_FORMAT_WAV | SF_FORMAT_FLOAT, 0x1p-24},
               {"d.wav", SF_FORMAT_WAV | SF_FORMAT_DOUBLE, 0x1p-53},
               {"rf.wav", SF_FORMAT_RF64 | SF_FORMAT_PCM_24, 0x1p-23},
               {"16.flac", SF_FORMAT_FLAC | SF_FORMAT_PCM_16, 0x1p-15},
               {"24.flac", SF_FORMAT_FLAC | SF_FORMAT_PCM_24, 0x1p-23},
               {"24.aiff", SF_FORMAT_AIFF | SF_FORMAT_PCM_24, 0x1p-23},
               {"f.aiff", SF_FORMAT_AIFF | SF_FORMAT_FLOAT, 0x1p-24}};
  for (const auto& kind : kinds) {
    CAPTURE(kind.name);
    write_as(folder.path() / kind.name, kind.format, w);
    const std::vector<Waveform> back = read_audio(folder.path() / kind.name);
    REQUIRE(back.size() == 1);
    CHECK(back[0].rate == Hertz(44100.0));
    REQUIRE(back[0].samples.size() == 5000);
    double worst = 0.0;
    for (std::size_t n = 0; n < 5000; ++n) {
      worst = std::max(worst, std::abs(back[0].samples[n] - w.samples[n]));
    }
    // Half a code of rounding, and one more for writers that scale by 2^n - 1.
    CHECK(worst <= 1.5 * kind.step);
    if (kind.step > 1e-5) CHECK(worst > 0.25 * kind.step);  // it was indeed that coarse
  }
}

TEST_CASE("a sample that is no number is named by channel and frame") {
  const TemporaryFolder folder;
  const auto file = folder.path() / "bad.wav";
  Waveform good = ramp(100), bad = good;
  bad.samples[42] = std::numeric_limits<double>::quiet_NaN();
  write_wav(file, {good, bad});
  CHECK(says(refusal(file), "channel 2, frame 42: the sample is nan"));
  good.samples[99] = std::numeric_limits<double>::infinity();
  write_wav(file, {good});
  CHECK(says(refusal(file), "channel 1, frame 99: the sample is inf"));
}

TEST_CASE("missing, foreign and empty files are refused in words") {
  const TemporaryFolder folder;
  CHECK(says(refusal(folder.path() / "gone.wav"), "no such file"));
  write_bytes(folder.path() / "text.wav", "this is no audio");
  CHECK(says(refusal(folder.path() / "text.wav"), "not an audio file"));
  CHECK(says(refusal(folder.path() / "text.wav"), "expected WAV, FLAC or AIFF"));
  write_bytes(folder.path() / "empty.wav", "");
  CHECK(says(refusal(folder.path() / "empty.wav"), "not an audio file"));
  CHECK(says(refusal(folder.path()), "not an audio file"));
  write_wav(folder.path() / "silent.wav", {Waveform{Hertz(48000), {}}});
  CHECK(says(refusal(folder.path() / "silent.wav"), "holds no sound"));
}

TEST_CASE("a FLAC cut short is refused; one streamed without a length is read to its end") {
  const TemporaryFolder folder;
  const auto file = folder.path() / "a.flac";
  write_as(file, SF_FORMAT_FLAC | SF_FORMAT_PCM_24, ramp(48000));
  std::string bytes = bytes_of(file);
  write_bytes(file, bytes.substr(0, bytes.size() / 2));
  const std::string sentence = refusal(file);
  CHECK(says(sentence, "cut short"));
  CHECK(says(sentence, "promises 48000 frames"));
  // STREAMINFO's 36-bit count of samples (RFC 9639, 8.2): low half of byte 21, bytes 22 to 25.
  bytes[21] = static_cast<char>(bytes[21] & 0xF0);
  std::fill_n(bytes.begin() + 22, 4, '\0');
  write_bytes(file, bytes);
  CHECK(read_audio(file)[0].samples.size() == 48000);
}

TEST_CASE("what cannot be written is told with its place; unequal channels are a mistake of ours") {
  const TemporaryFolder folder;
  const auto nowhere = folder.path() / "no-such-folder" / "a.wav";
  CHECK_THROWS_WITH_AS(write_wav(nowhere, {ramp(10)}),
                       doctest::Contains((nowhere.string() + ": cannot be written").c_str()),
                       InputError);
  CHECK_THROWS_AS(write_wav(folder.path() / "a.wav", {}), std::invalid_argument);
  CHECK_THROWS_AS(write_wav(folder.path() / "a.wav", {ramp(10), ramp(11)}), std::invalid_argument);
  CHECK_THROWS_AS(write_wav(folder.path() / "a.wav", {ramp(10), ramp(10, 44100.0)}),
                  std::invalid_argument);
}

}  // namespace kneeprint
