// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/portaudio_port.h"

#include <fmt/format.h>
#include <portaudio.h>

#include <algorithm>
#include <atomic>
#include <cctype>
#include <chrono>
#include <cmath>

#include "platform/os.h"
#include "quantity/failure.h"

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

// The stream is opened once and runs until the port goes, silent between takes: starting and
// stopping it for every take would shift the latency (and, on JACK, drop the connections).
class PortAudioPort : public Port {
 public:
  explicit PortAudioPort(const LiveSettings& settings);
  ~PortAudioPort() override;
  const PortInfo& info() const override { return info_; }
  void play(Player& player, int take) override;

 private:
  static int callback(const void* input, void* output, unsigned long frames,
                      const PaStreamCallbackTimeInfo*, PaStreamCallbackFlags flags,
                      void* self) noexcept;
  void serve(const float* const* in, float* const* out, unsigned long frames,
             PaStreamCallbackFlags flags) noexcept;
  void wait_while(Player& player);

  Library library_;
  LiveSettings settings_;
  PortInfo info_;
  int outputs_ = 0, inputs_ = 0;
  PaStream* stream_ = nullptr;
  std::atomic<Player*> player_{nullptr};
  // Raised around the callback's use of the player, so that play() never returns while it is in
  // use.
  std::atomic<bool> serving_{false};
  std::atomic<unsigned long> callbacks_{0};
};

PortAudioPort::PortAudioPort(const LiveSettings& settings) : settings_(settings) {
  const os::QuietStderr quiet;
  const DeviceInfo device = pick_device(settings.device);
  outputs_ = settings.send_channel;
  inputs_ = std::max(settings.return_channel, settings.reference_channel);
  if (device.outputs < outputs_ || device.inputs < inputs_) {
    throw DeviceError(fmt::format(
        "\"{}\" has {} outputs and {} inputs; send {}, return {}{} were asked for", device.name,
        device.outputs, device.inputs, settings.send_channel, settings.return_channel,
        settings.reference_channel > 0 ? fmt::format(", reference {}", settings.reference_channel)
                                       : ""));
  }
  const double rate =
      settings.rate.value() > 0.0 ? settings.rate.value() : device.default_rate.value();
  const PaDeviceInfo* d = Pa_GetDeviceInfo(device.index);
  const PaStreamParameters in{device.index, inputs_, paFloat32 | paNonInterleaved,
                              d->defaultHighInputLatency, nullptr};
  const PaStreamParameters out{device.index, outputs_, paFloat32 | paNonInterleaved,
                               d->defaultHighOutputLatency, nullptr};
  // No dither and no clipping by the library: what leaves is what the guard let through.
  PaError error = Pa_OpenStream(&stream_, &in, &out, rate, paFramesPerBufferUnspecified,
                                paClipOff | paDitherOff, callback, this);
  if (error == paNoError) error = Pa_StartStream(stream_);
  if (error != paNoError) {
    const PaHostErrorInfo* host = Pa_GetLastHostErrorInfo();
    const std::string detail =
        error == paUnanticipatedHostError ? fmt::format(" ({})", host->errorText) : "";
    if (stream_ != nullptr) Pa_CloseStream(stream_);
    throw DeviceError(fmt::format(
        "\"{}\" cannot be opened for playing and recording together at {:g} Hz: {}{}; try another "
        "--rate, and close other programs that hold the device",
        device.name, rate, Pa_GetErrorText(error), detail));
  }
  const PaStreamInfo* stream = Pa_GetStreamInfo(stream_);
  info_.name = fmt::format("{} ({})", device.name, device.host_api);
  info_.rate = Hertz(stream->sampleRate);
  info_.live = true;
  info_.has_reference = settings.reference_channel > 0;
  info_.reported_latency = Seconds(stream->inputLatency + stream->outputLatency);
}

PortAudioPort::~PortAudioPort() {
  const os::QuietStderr quiet;
  Pa_StopStream(stream_);
  Pa_CloseStream(stream_);
}

int PortAudioPort::callback(const void* input, void* output, unsigned long frames,
                            const PaStreamCallbackTimeInfo*, PaStreamCallbackFlags flags,
                            void* self) noexcept {
  static_cast<PortAudioPort*>(self)->serve(static_cast<const float* const*>(input),
                                           static_cast<float* const*>(output), frames, flags);
  return paContinue;
}

void PortAudioPort::serve(const float* const* in, float* const* out, unsigned long frames,
                          PaStreamCallbackFlags flags) noexcept {
  callbacks_.fetch_add(1, std::memory_order_relaxed);
  for (int c = 0; c < outputs_; ++c) std::fill_n(out[c], frames, 0.0f);
  serving_.store(true);
  if (Player* player = player_.load(); player != nullptr) {
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
}

void PortAudioPort::wait_while(Player& player) {
  using Clock = std::chrono::steady_clock;
  constexpr auto kSilentDevice = std::chrono::seconds(3);
  constexpr long kPollMilliseconds = 5;
  unsigned long seen = callbacks_.load();
  auto last_call = Clock::now();
  while (player_.load() != nullptr) {
    if (os::interrupted()) player.mute();
    Pa_Sleep(kPollMilliseconds);
    const unsigned long now = callbacks_.load();
    if (now != seen) {
      seen = now;
      last_call = Clock::now();
    }
    if (Pa_IsStreamActive(stream_) != 1 || Clock::now() - last_call > kSilentDevice) {
      player_.store(nullptr);
      throw DeviceError(
          fmt::format("{}: the device stopped in mid-take. Check its cable and power and the audio "
                      "server, then go "
                      "on with --resume.",
                      info_.name));
    }
  }
}

void PortAudioPort::play(Player& player, int) {
  player_.store(&player);
  try {
    wait_while(player);
  } catch (...) {
    while (serving_.load()) Pa_Sleep(1);
    throw;
  }
  while (serving_.load()) Pa_Sleep(1);
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
