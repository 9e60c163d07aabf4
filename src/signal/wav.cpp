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

constexpr std::size_t kBlock = 16384;  // frames read or written at a time

sf_count_t read_frames(SNDFILE* sound, float* to, std::size_t frames) {
  return sf_readf_float(sound, to, static_cast<sf_count_t>(frames));
}
sf_count_t read_frames(SNDFILE* sound, double* to, std::size_t frames) {
  return sf_readf_double(sound, to, static_cast<sf_count_t>(frames));
}

// Appends every frame that can be read to `out`, one waveform per channel; returns their number.
template <class Sample>
sf_count_t append_all(SNDFILE* sound, const std::string& name, std::vector<Waveform>& out) {
  std::vector<Sample> interleaved(kBlock * out.size());
  sf_count_t total = 0;
  for (sf_count_t got = 0; (got = read_frames(sound, interleaved.data(), kBlock)) > 0;) {
    const auto count = static_cast<std::size_t>(got);
    for (std::size_t c = 0; c < out.size(); ++c) {
      std::vector<double>& samples = out[c].samples;
      const std::size_t start = samples.size();
      samples.resize(start + count);
      double doubtful = 0.0;  // 0 x stays 0 for every finite number
      for (std::size_t n = 0; n < count; ++n) {
        const double x = interleaved[n * out.size() + c];
        samples[start + n] = x;
        doubtful += 0.0 * x;
      }
      if (doubtful == 0.0) continue;
      const auto bad = std::find_if_not(samples.begin() + static_cast<long>(start), samples.end(),
                                        [](double x) { return std::isfinite(x); });
      throw InputError(
          fmt::format("{}: channel {}, frame {}: the sample is {}; expected a finite number", name,
                      c + 1, bad - samples.begin(), *bad));
    }
    total += got;
  }
  return total;
}

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
  std::error_code no_size;
  const std::uintmax_t bytes = std::filesystem::file_size(file, no_size);
  if (length_known && !no_size) {
    // A header may promise anything: no more than the file's bytes could hold uncompressed.
    const auto frames = std::min(static_cast<std::uintmax_t>(info.frames), bytes);
    for (Waveform& w : out) w.samples.reserve(frames);
  }
  // libsndfile hands 32-bit floats, as takes hold them, over in one go; the rest it scales to
  // doubles piece by piece.
  const bool floats = (info.format & SF_FORMAT_SUBMASK) == SF_FORMAT_FLOAT;
  const sf_count_t total = floats ? append_all<float>(sound.get(), name, out)
                                  : append_all<double>(sound.get(), name, out);
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
