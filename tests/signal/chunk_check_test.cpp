// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/chunk_check.h"

#include <doctest/doctest.h>
#include <sndfile.h>

#include <string>
#include <vector>

#include "quantity/failure.h"
#include "signal/wav.h"
#include "temporary_folder.h"

namespace kneeprint {
namespace {

using testing::bytes_of;
using testing::TemporaryFolder;
using testing::write_bytes;

constexpr std::size_t kFrames = 3000;

// A 24-bit file of that kind: its sound takes 9000 bytes and ends the file.
std::string bytes_as(int container, const std::filesystem::path& file) {
  SF_INFO info{};
  info.samplerate = 48000;
  info.channels = 1;
  info.format = container | SF_FORMAT_PCM_24;
  SNDFILE* sound = sf_open(file.string().c_str(), SFM_WRITE, &info);
  REQUIRE(sound != nullptr);
  const std::vector<double> x(kFrames, 0.25);
  CHECK(sf_writef_double(sound, x.data(), kFrames) == kFrames);
  sf_close(sound);
  return bytes_of(file);
}

}  // namespace

TEST_CASE("WAV, RF64 and AIFF cut at the end are told by bytes promised and found") {
  const TemporaryFolder folder;
  const auto file = folder.path() / "a";
  for (const int container : {SF_FORMAT_WAV, SF_FORMAT_RF64, SF_FORMAT_AIFF}) {
    CAPTURE(container);
    const std::string bytes = bytes_as(container, file);
    check_chunks_are_whole(file);
    for (const std::size_t lost : {1, 3, 5000}) {
      write_bytes(file, bytes.substr(0, bytes.size() - lost));
      // AIFF counts its offset and block fields, 8 bytes, with the sound.
      const std::size_t size = 3 * kFrames + (container == SF_FORMAT_AIFF ? 8 : 0);
      const std::string expected = file.string() + ": cut short: its header promises " +
                                   std::to_string(size) + " bytes of sound, " +
                                   std::to_string(size - lost) + " are there";
      CHECK_THROWS_WITH_AS(check_chunks_are_whole(file), doctest::Contains(expected.c_str()),
                           InputError);
      CHECK_THROWS_AS(read_audio(file), InputError);
    }
  }
}

TEST_CASE("sizes that stand for unknown pass, and the file is read to its end") {
  const TemporaryFolder folder;
  const auto file = folder.path() / "streamed.wav";
  const std::string bytes = bytes_as(SF_FORMAT_WAV, file);
  const std::size_t data = bytes.find("data") + 4;
  // Two programs' habits: all ones, and a round number just below 2^31.
  for (const std::string& size :
       {std::string("\xff\xff\xff\xff"), std::string("\xff\xef\xff\x7f")}) {
    std::string streamed = bytes;
    streamed.replace(4, 4, size);
    streamed.replace(data, 4, size);
    write_bytes(file, streamed);
    CHECK(read_audio(file)[0].samples.size() == kFrames);
  }
}

TEST_CASE("chunks after the sound and odd sizes do not mislead") {
  const TemporaryFolder folder;
  const auto file = folder.path() / "a.wav";
  const std::string bytes = bytes_as(SF_FORMAT_WAV, file);
  const std::size_t data = bytes.find("data");
  // A chunk of odd length before the sound is padded by one byte.
  const std::string odd = std::string("note\x03\0\0\0abc\0", 12);
  const std::string late = std::string("note\x02\0\0\0ab", 10);
  write_bytes(file, bytes.substr(0, data) + odd + bytes.substr(data) + late);
  check_chunks_are_whole(file);
  CHECK(read_audio(file)[0].samples.size() == kFrames);
  // The late chunk's bytes count as there, but only one sample's worth: the sound is still short.
  write_bytes(file, bytes.substr(0, data) + odd + bytes.substr(data, 100));
  CHECK_THROWS_AS(check_chunks_are_whole(file), InputError);
}

TEST_CASE("other files, headers cut within, and no file at all are left to the reader") {
  const TemporaryFolder folder;
  const auto file = folder.path() / "a";
  check_chunks_are_whole(folder.path() / "gone");
  check_chunks_are_whole(folder.path());
  for (const std::string bytes : {"", "RI", "fLaC....", "RIFF1234WAVE", "RIFF1234WAVEdata\x01"}) {
    write_bytes(file, bytes);
    check_chunks_are_whole(file);
  }
}

}  // namespace kneeprint
