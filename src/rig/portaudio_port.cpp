// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/portaudio_port.h"

#include <fmt/format.h>
#include <portaudio.h>

#include <algorithm>
#include <atomic>
#include <cctype>
#include <chrono>
#include <string>
#include <vector>

#include "platform/os.h"
#include "quantity/failure.h"
#include "signal/waveform.h"

namespace kneeprint {
namespace {

// PortAudio for as long as it lives; drivers print while they are probed.
class Library {
 public:
  Library() {
    const os::QuietStderr quiet;
    const PaError error = Pa_Initialize();
    if (error != paNoError) {
      throw DeviceError(fmt::format("the audio system does not start: {}", Pa_GetErrorText(error)));
    }
  }
  ~Library() {
    const os::QuietStderr quiet;
    Pa_Terminate();
  }
  Library(const Library&) = delete;
  Library& operator=(const Library&) = delete;
};

DeviceInfo describe_device(int index) {
  const PaDeviceInfo* d = Pa_GetDeviceInfo(index);
  return {index,
          d->name,
          Pa_GetHostApiInfo(d->hostApi)->name,
          d->maxInputChannels,
          d->maxOutputChannels,
          Hertz(d->defaultSampleRate)};
}

std::vector<DeviceInfo> all_devices() {
  std::vector<DeviceInfo> out;
  for (int i = 0; i < Pa_GetDeviceCount(); ++i) out.push_back(describe_device(i));
  return out;
}

std::string lower(std::string text) {
  for (char& c : text) c = static_cast<char>(std::tolower(static_cast<unsigned char>(c)));
  return text;
}

std::string names_of(const std::vector<DeviceInfo>& devices) {
  std::string text;
  for (const DeviceInfo& d : devices) {
    text += fmt::format("{}{} \"{}\" ({})", text.empty() ? "" : ", ", d.index, d.name, d.host_api);
  }
  return text.empty() ? "there is no audio device" : "there are: " + text;
}

DeviceInfo pick_device(const std::string& wanted) {
  const std::vector<DeviceInfo> devices = all_devices();
  if (!wanted.empty() && std::all_of(wanted.begin(), wanted.end(), [](char c) {
        return std::isdigit(static_cast<unsigned char>(c)) != 0;
      })) {
    const auto by_index = std::find_if(devices.begin(), devices.end(), [&](const DeviceInfo& d) {
      return std::to_string(d.index) == wanted;
    });
    if (by_index != devices.end()) return *by_index;
    throw DeviceError(fmt::format("no audio device {}; {}", wanted, names_of(devices)));
  }
  std::vector<DeviceInfo> matching, exact;
  for (const DeviceInfo& d : devices) {
    if (lower(d.name).find(lower(wanted)) != std::string::npos) matching.push_back(d);
    if (lower(d.name) == lower(wanted)) exact.push_back(d);
  }
  if (exact.size() == 1) return exact.front();
  if (matching.size() == 1) return matching.front();
  if (matching.empty()) {
    throw DeviceError(
        fmt::format("no audio device is named like \"{}\"; {}", wanted, names_of(devices)));
  }
  throw DeviceError(
      fmt::format("several audio devices are named like \"{}\": say which by index; {}", wanted,
                  names_of(matching)));
}

using Clock = std::chrono::steady_clock;
constexpr auto kStalled = std::chrono::seconds(5);  // longer than the buffers of any driver
constexpr long kPollMilliseconds = 5;
// Drivers may flag an underrun in their first buffers, when there is no input yet, and converters
// thump when their clock starts: takes begin after both.
constexpr Seconds kWarmUp{0.2};
constexpr Seconds kLongestLatency{10.0};

// Whether a count that ought to grow still does.
class Growth {
 public:
  bool stopped(std::size_t count) {
    const auto now = Clock::now();
    if (count != seen_) since_ = now;
    seen_ = count;
    return now - since_ > kStalled;
  }

 private:
  std::size_t seen_ = 0;
  Clock::time_point since_ = Clock::now();
};

// One full-duplex stream with all that its callback touches. It runs from the first take to the
// last, silent between them: starting and stopping it for every take would shift the latency (and,
// on JACK, drop the connections).
class Stream {
 public:
  explicit Stream(const LiveSettings& settings);
  ~Stream();
  Stream(const Stream&) = delete;
  Stream& operator=(const Stream&) = delete;

  PortInfo info() const;
  // Runs the player to its end; false when the device stops before that.
  bool play(Player& player);
  // Waits until so many frames have passed; false when the device has stopped calling.
  bool runs_for(std::size_t frames) const;

 private:
  static int callback(const void* input, void* output, unsigned long frames,
                      const PaStreamCallbackTimeInfo*, PaStreamCallbackFlags flags,
                      void* self) noexcept;
  void serve(const float* const* in, float* const* out, unsigned long frames,
             PaStreamCallbackFlags flags) noexcept;
  bool wait_for_end(Player& player) const;

  Library library_;
  LiveSettings settings_;
  DeviceInfo device_;
  int outputs_ = 0, inputs_ = 0;
  PaStream* stream_ = nullptr;
  std::atomic<Player*> player_{nullptr};
  // Raised around the callback's use of the player, so that play() never returns while it is in
  // use.
  std::atomic<bool> serving_{false};
  std::atomic<std::size_t> frames_{0};
  std::atomic<std::size_t> buffer_{0};
};

static_assert(std::atomic<Player*>::is_always_lock_free &&
                  std::atomic<std::size_t>::is_always_lock_free,
              "the audio thread takes no lock");

Stream::Stream(const LiveSettings& settings) : settings_(settings) {
  if (settings.reference_channel == settings.return_channel) {
    throw UsageError(
        fmt::format("the reference and the return are both input {}: give them one each",
                    settings.return_channel));
  }
  const os::QuietStderr quiet;
  device_ = pick_device(settings.device);
  outputs_ = settings.send_channel;
  inputs_ = std::max(settings.return_channel, settings.reference_channel);
  if (device_.outputs < outputs_ || device_.inputs < inputs_) {
    throw DeviceError(fmt::format(
        "\"{}\" has {} outputs and {} inputs; send {}, return {}{} were asked for", device_.name,
        device_.outputs, device_.inputs, settings.send_channel, settings.return_channel,
        settings.reference_channel > 0 ? fmt::format(", reference {}", settings.reference_channel)
                                       : ""));
  }
  const double rate =
      settings.rate.value() > 0.0 ? settings.rate.value() : device_.default_rate.value();
  const PaDeviceInfo* d = Pa_GetDeviceInfo(device_.index);
  const PaStreamParameters in{device_.index, inputs_, paFloat32 | paNonInterleaved,
                              d->defaultHighInputLatency, nullptr};
  const PaStreamParameters out{device_.index, outputs_, paFloat32 | paNonInterleaved,
                               d->defaultHighOutputLatency, nullptr};
  // No dither and no clipping by the library: what leaves is what the guard let through.
  PaError error = Pa_OpenStream(&stream_, &in, &out, rate, paFramesPerBufferUnspecified,
                                paClipOff | paDitherOff, callback, this);
  if (error == paNoError) error = Pa_StartStream(stream_);
  if (error != paNoError) {
    const std::string detail = error == paUnanticipatedHostError
                                   ? fmt::format(" ({})", Pa_GetLastHostErrorInfo()->errorText)
                                   : "";
    if (stream_ != nullptr) Pa_CloseStream(stream_);
    throw DeviceError(fmt::format(
        "\"{}\" cannot be opened for playing and recording together at {:g} Hz: {}{}; try another "
        "--rate, and close other programs that hold the device",
        device_.name, rate, Pa_GetErrorText(error), detail));
  }
}

Stream::~Stream() {
  const os::QuietStderr quiet;
  Pa_StopStream(stream_);
  Pa_CloseStream(stream_);
}

PortInfo Stream::info() const {
  const PaStreamInfo* stream = Pa_GetStreamInfo(stream_);
  PortInfo info;
  info.name = fmt::format("{} ({})", device_.name, device_.host_api);
  info.rate = Hertz(stream->sampleRate);
  info.live = true;
  info.has_reference = settings_.reference_channel > 0;
  info.buffer_frames = buffer_.load();
  // PortAudio on JACK has been seen to claim 2^33 frames: then the latency is unknown.
  const Seconds claimed(stream->inputLatency + stream->outputLatency);
  if (claimed >= Seconds(0.0) && claimed < kLongestLatency) info.reported_latency = claimed;
  return info;
}

int Stream::callback(const void* input, void* output, unsigned long frames,
                     const PaStreamCallbackTimeInfo*, PaStreamCallbackFlags flags,
                     void* self) noexcept {
  static_cast<Stream*>(self)->serve(static_cast<const float* const*>(input),
                                    static_cast<float* const*>(output), frames, flags);
  return paContinue;
}

void Stream::serve(const float* const* in, float* const* out, unsigned long frames,
                   PaStreamCallbackFlags flags) noexcept {
  buffer_.store(frames, std::memory_order_relaxed);
  for (int c = 0; c < outputs_; ++c) std::fill_n(out[c], frames, 0.0f);
  serving_.store(true);
  if (Player* player = player_.load(); player != nullptr) {
    // Not paPrimingOutput: that marks buffers asked for in advance, not lost ones.
    constexpr PaStreamCallbackFlags kLost =
        paInputUnderflow | paInputOverflow | paOutputUnderflow | paOutputOverflow;
    if ((flags & kLost) != 0 || in == nullptr) player->count_dropout();
    if (in != nullptr) {
      const std::span<const float> returned(in[settings_.return_channel - 1], frames);
      const std::span<const float> reference =
          settings_.reference_channel > 0
              ? std::span<const float>(in[settings_.reference_channel - 1], frames)
              : std::span<const float>();
      const bool more = player->process(returned, reference,
                                        std::span<float>(out[settings_.send_channel - 1], frames));
      if (!more) player_.store(nullptr);
    }
  }
  serving_.store(false);
  frames_.fetch_add(frames, std::memory_order_relaxed);
}

bool Stream::runs_for(std::size_t frames) const {
  const std::size_t from = frames_.load();
  Growth growth;
  while (frames_.load() - from < frames) {
    Pa_Sleep(kPollMilliseconds);
    if (Pa_IsStreamActive(stream_) != 1 || growth.stopped(frames_.load())) return false;
  }
  return true;
}

bool Stream::wait_for_end(Player& player) const {
  // A slow start and a busy machine are allowed for; half the speed is not a sound device.
  const double take_s =
      static_cast<double>(player.length()) / Pa_GetStreamInfo(stream_)->sampleRate;
  const auto deadline = Clock::now() + kStalled + std::chrono::duration<double>(2.0 * take_s);
  Growth growth;
  while (player_.load() != nullptr) {
    if (os::interrupted()) player.mute();
    Pa_Sleep(kPollMilliseconds);
    if (player_.load() == nullptr) break;
    if (Pa_IsStreamActive(stream_) != 1 || growth.stopped(player.recorded()) ||
        Clock::now() > deadline) {
      return false;
    }
  }
  return true;
}

bool Stream::play(Player& player) {
  player_.store(&player);
  const bool ended = wait_for_end(player);
  player_.store(nullptr);
  while (serving_.load()) Pa_Sleep(1);
  return ended;
}

class PortAudioPort : public Port {
 public:
  explicit PortAudioPort(const LiveSettings& settings);
  ~PortAudioPort() override;
  const PortInfo& info() const override { return info_; }
  void play(Player& player, int take) override;

 private:
  [[noreturn]] void lose(const std::string& what);

  std::unique_ptr<Stream> stream_;
  PortInfo info_;
};

PortAudioPort::PortAudioPort(const LiveSettings& settings)
    : stream_(std::make_unique<Stream>(settings)), info_(stream_->info()) {
  if (!stream_->runs_for(samples_in(kWarmUp, info_.rate))) lose("the device does not start");
  info_ = stream_->info();
}

PortAudioPort::~PortAudioPort() {
  // Here too the device may be gone; then nothing of it can be closed (see below).
  if (stream_ && !stream_->runs_for(1)) stream_.release();
}

// PortAudio closes a stream, and itself, only after one more callback; on JACK it waits minutes for
// that when the server is gone. So a lost stream is left behind with all that its callback touches:
// should the device call again, it is answered with silence.
void PortAudioPort::lose(const std::string& what) {
  stream_.release();
  throw DeviceError(fmt::format(
      "{}: {}. Check its cable and power and the audio server, then go on with --resume.",
      info_.name, what));
}

void PortAudioPort::play(Player& player, int) {
  if (!stream_) lose("the device was lost in an earlier take");
  if (!stream_->play(player)) lose("the device stopped in mid-take");
}

}  // namespace

std::vector<DeviceInfo> list_devices() {
  const Library library;
  return all_devices();
}

std::unique_ptr<Port> make_portaudio_port(const LiveSettings& settings) {
  return std::make_unique<PortAudioPort>(settings);
}

}  // namespace kneeprint
