// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/wav.h"

#include <fmt/format.h>
#include <sndfile.h>

#include <array>
#include <cmath>
#include <cstdint>
#include <fstream>
#include <memory>

#include "quantity/failure.h"

namespace kneeprint {
namespace {

struct Closer {
  void operator()(SNDFILE* f) const { sf_close(f); }
};
using SoundFile = std::unique_ptr<SNDFILE, Closer>;

std::uint32_t little_endian(const std::array<unsigned char, 4>& b) {
  return b[0] | b[1] << 8 | b[2] << 16 | static_cast<std::uint32_t>(b[3]) << 24;
}

// libsndfile quietly shortens a WAV whose data chunk promises more than the file holds; a recording cut
// short must be told. Streamed files say 0 or 2^32 - 1 bytes ("unknown") and pass.
void check_riff_is_whole(const std::filesystem::path& file) {
  std::ifstream in(file, std::ios::binary);
  std::array<char, 4> tag{}, wave{};
  std::array<unsigned char, 4> raw{};
  const auto read4 = [&](auto& to) {
    return static_cast<bool>(in.read(reinterpret_cast<char*>(to.data()), 4));
  };
  if (!read4(tag) || std::string(tag.data(), 4) != "RIFF" || !read4(raw) || !read4(wave)) return;
  const auto have = static_cast<std::uint64_t>(std::filesystem::file_size(file));
  while (read4(tag) && read4(raw)) {
    const std::uint32_t size = little_endian(raw);
    const auto here = static_cast<std::uint64_t>(in.tellg());
    if (std::string(tag.data(), 4) == "data") {
      if (size != 0 && size != 0xFFFFFFFFu && here + size > have) {
        throw InputError(fmt::format(
            "{}: cut short: its header promises {} bytes of sound, {} are there; copy or export the "
            "recording again",
            file.string(), size, have - here));
      }
      return;
    }
    in.seekg(static_cast<std::streamoff>(size + size % 2), std::ios::cur);
  }
}

}  // namespace

std::vector<Waveform> read_audio(const std::filesystem::path& file) {
  if (!std::filesystem::exists(file)) {
    throw InputError(fmt::format("{}: no such file", file.string()));
  }
  check_riff_is_whole(file);
  SF_INFO info{};
  const SoundFile sound(sf_open(file.c_str(), SFM_READ, &info));
  if (!sound) {
    throw InputError(fmt::format("{}: not an audio file that can be read ({}); WAV, FLAC or AIFF is "
                                 "expected",
                                 file.string(), sf_strerror(nullptr)));
  }
  if (info.frames <= 0) throw InputError(fmt::format("{}: holds no sound", file.string()));
  const auto channels = static_cast<std::size_t>(info.channels);
  std::vector<Waveform> out(channels);
  for (Waveform& w : out) {
    w.rate = Hertz(info.samplerate);
    w.samples.reserve(static_cast<std::size_t>(info.frames));
  }
  constexpr std::size_t kFrames = 65536;
  std::vector<double> interleaved(kFrames * channels);
  sf_count_t total = 0;
  while (const sf_count_t got = sf_readf_double(sound.get(), interleaved.data(), kFrames)) {
    for (sf_count_t n = 0; n < got; ++n) {
      for (std::size_t c = 0; c < channels; ++c) {
        const double x = interleaved[static_cast<std::size_t>(n) * channels + c];
        if (!std::isfinite(x)) {
          throw InputError(fmt::format("{}: channel {}, frame {}: the sample is {}, not a number that "
                                       "sound can have",
                                       file.string(), c + 1, total + n, x));
        }
        out[c].samples.push_back(x);
      }
    }
    total += got;
  }
  if (total != info.frames) {
    throw InputError(fmt::format("{}: cut short: its header promises {} frames, {} are there",
                                 file.string(), info.frames, total));
  }
  return out;
}

void write_wav(const std::filesystem::path& file, const std::vector<Waveform>& channels) {
  SF_INFO info{};
  info.samplerate = static_cast<int>(std::lround(channels.front().rate.value()));
  info.channels = static_cast<int>(channels.size());
  info.format = SF_FORMAT_WAV | SF_FORMAT_FLOAT;
  SoundFile sound(sf_open(file.c_str(), SFM_WRITE, &info));
  if (!sound) {
    throw InputError(fmt::format("{}: cannot be written: {}", file.string(), sf_strerror(nullptr)));
  }
  // The PEAK chunk carries the time of writing: equal takes would not be equal files.
  sf_command(sound.get(), SFC_SET_ADD_PEAK_CHUNK, nullptr, SF_FALSE);
  const std::size_t frames = channels.front().samples.size();
  std::vector<float> interleaved(frames * channels.size());
  for (std::size_t c = 0; c < channels.size(); ++c) {
    for (std::size_t n = 0; n < frames; ++n) {
      interleaved[n * channels.size() + c] = static_cast<float>(channels[c].samples[n]);
    }
  }
  const auto wanted = static_cast<sf_count_t>(frames);
  if (sf_writef_float(sound.get(), interleaved.data(), wanted) != wanted ||
      sf_close(sound.release()) != 0) {
    throw InputError(fmt::format("{}: cannot be written whole; is the disk full?", file.string()));
  }
}

}  // namespace kneeprint
