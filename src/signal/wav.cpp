// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/wav.h"

#include <fmt/format.h>
#include <sndfile.h>

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <limits>
#include <memory>
#include <stdexcept>

#include "quantity/failure.h"
#include "signal/chunk_check.h"

namespace kneeprint {
namespace {

struct Closer {
  void operator()(SNDFILE* f) const { sf_close(f); }
};
using SoundFile = std::unique_ptr<SNDFILE, Closer>;

constexpr std::size_t kBlock = 8192;  // frames read or written at a time

}  // namespace

std::vector<Waveform> read_audio(const std::filesystem::path& file) {
  const std::string name = file.string();
  if (!std::filesystem::exists(file)) throw InputError(fmt::format("{}: no such file", name));
  check_chunks_are_whole(file);
  SF_INFO info{};
  const SoundFile sound(sf_open(name.c_str(), SFM_READ, &info));
  if (!sound) {
    throw InputError(
        fmt::format("{}: not an audio file that can be read ({}); expected WAV, FLAC or AIFF", name,
                    sf_strerror(nullptr)));
  }
  const auto channels = static_cast<std::size_t>(info.channels);
  // A FLAC written into a pipe has no length; libsndfile then says the largest it knows.
  const bool length_known = info.frames < std::numeric_limits<sf_count_t>::max();
  std::vector<Waveform> out(channels, Waveform{Hertz(info.samplerate), {}});
  if (length_known) {
    // A header may promise anything: no more than the file's bytes could hold uncompressed.
    const std::uintmax_t most = std::min<std::uintmax_t>(static_cast<std::uintmax_t>(info.frames),
                                                         std::filesystem::file_size(file));
    for (Waveform& w : out) w.samples.reserve(most);
  }
  std::vector<double> interleaved(kBlock * channels);
  sf_count_t total = 0;
  while (true) {
    const sf_count_t got = sf_readf_double(sound.get(), interleaved.data(), kBlock);
    if (got <= 0) break;
    for (std::size_t c = 0; c < channels; ++c) {
      const std::size_t start = out[c].samples.size(), count = static_cast<std::size_t>(got);
      out[c].samples.resize(start + count);
      double* samples = out[c].samples.data() + start;
      double doubtful = 0.0;  // 0 x stays 0 for every finite number
      for (std::size_t n = 0; n < count; ++n) {
        samples[n] = interleaved[n * channels + c];
        doubtful += 0.0 * samples[n];
      }
      if (doubtful == 0.0) continue;
      const double* bad =
          std::find_if_not(samples, samples + count, [](double x) { return std::isfinite(x); });
      throw InputError(
          fmt::format("{}: channel {}, frame {}: the sample is {}; expected a finite number", name,
                      c + 1, static_cast<std::size_t>(total + (bad - samples)), *bad));
    }
    total += got;
  }
  if (length_known && total < info.frames) {
    throw InputError(
        fmt::format("{}: cut short: its header promises {} frames, {} can be read; "
                    "copy or export the recording again",
                    name, info.frames, total));
  }
  if (sf_error(sound.get()) != SF_ERR_NO_ERROR) {
    throw InputError(
        fmt::format("{}: damaged after {} frames ({})", name, total, sf_strerror(sound.get())));
  }
  if (total == 0) throw InputError(fmt::format("{}: holds no sound", name));
  return out;
}

void write_wav(const std::filesystem::path& file, const std::vector<Waveform>& channels) {
  if (channels.empty()) throw std::invalid_argument("no channel to write");
  const Waveform& first = channels.front();
  const std::size_t frames = first.samples.size();
  for (const Waveform& w : channels) {
    if (w.rate != first.rate || w.samples.size() != frames) {
      throw std::invalid_argument("channels of one file must have the same rate and length");
    }
  }
  constexpr std::uint64_t kMostBytes = std::numeric_limits<std::uint32_t>::max() - 1000;
  if (std::uint64_t{frames} * channels.size() * sizeof(float) > kMostBytes) {
    throw InputError(
        fmt::format("{}: {} frames of {} channels pass the 4 GiB that a WAV file holds",
                    file.string(), frames, channels.size()));
  }
  SF_INFO info{};
  info.samplerate = static_cast<int>(std::lround(first.rate.value()));
  info.channels = static_cast<int>(channels.size());
  info.format = SF_FORMAT_WAV | SF_FORMAT_FLOAT;
  SoundFile sound(sf_open(file.string().c_str(), SFM_WRITE, &info));
  if (!sound) {
    throw InputError(
        fmt::format("{}: cannot be written ({})", file.string(), sf_strerror(nullptr)));
  }
  // The PEAK chunk carries the time of writing: equal takes would not be equal files.
  sf_command(sound.get(), SFC_SET_ADD_PEAK_CHUNK, nullptr, SF_FALSE);
  std::vector<float> interleaved;
  bool whole = true;
  for (std::size_t start = 0; start < frames && whole; start += kBlock) {
    const std::size_t count = std::min(kBlock, frames - start);
    interleaved.resize(count * channels.size());
    for (std::size_t c = 0; c < channels.size(); ++c) {
      for (std::size_t n = 0; n < count; ++n) {
        interleaved[n * channels.size() + c] = static_cast<float>(channels[c].samples[start + n]);
      }
    }
    const auto wanted = static_cast<sf_count_t>(count);
    whole = sf_writef_float(sound.get(), interleaved.data(), wanted) == wanted;
  }
  if (sf_close(sound.release()) != 0) whole = false;
  if (!whole) {
    throw InputError(fmt::format("{}: cannot be written whole; is the disk full?", file.string()));
  }
}

}  // namespace kneeprint
