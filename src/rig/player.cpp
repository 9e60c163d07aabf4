// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/player.h"

#include <algorithm>

namespace kneeprint {
namespace {

constexpr std::size_t kLargestPiece = 256;

}  // namespace

Player::Player(const Waveform& stimulus, std::size_t tail, bool with_reference, Guard& guard)
    : stimulus_(stimulus.samples),
      guard_(guard),
      returned_(stimulus.samples.size() + tail, 0.0f),
      reference_(with_reference ? stimulus.samples.size() + tail : 0, 0.0f),
      silence_(kLargestPiece, 0.0) {}

bool Player::process(std::span<const float> returned, std::span<const float> reference,
                     std::span<float> out) noexcept {
  const std::size_t position = position_.load(std::memory_order_relaxed);
  guard_.watch(returned);
  const std::size_t kept = std::min(out.size(), returned_.size() - position);
  std::copy_n(returned.begin(), kept, returned_.begin() + static_cast<long>(position));
  if (!reference_.empty() && !reference.empty()) {
    std::copy_n(reference.begin(), kept, reference_.begin() + static_cast<long>(position));
  }
  std::size_t done = 0;
  while (done < out.size()) {
    const std::size_t at = position + done;
    if (at < stimulus_.size()) {
      const std::size_t piece = std::min(out.size() - done, stimulus_.size() - at);
      guard_.process(std::span(stimulus_).subspan(at, piece), out.subspan(done, piece));
      done += piece;
    } else {
      const std::size_t piece = std::min(out.size() - done, silence_.size());
      guard_.process(std::span<const double>(silence_).first(piece), out.subspan(done, piece));
      done += piece;
    }
  }
  position_.store(position + kept, std::memory_order_release);
  return position + kept < returned_.size() && !guard_.silent();
}

double Player::progress() const {
  return length() == 0 ? 1.0 : static_cast<double>(recorded()) / static_cast<double>(length());
}

}  // namespace kneeprint
