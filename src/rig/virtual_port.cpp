// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/virtual_port.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <vector>

#include "quantity/failure.h"
#include "rig/virtual_chain.h"

namespace kneeprint {
namespace {

constexpr std::size_t kBufferFrames = 256;

std::string text_of(const VirtualRigName& name) {
  std::string text = name.unit;
  for (const auto& [key, value] : name.settings) {
    text += fmt::format("{}{}={}", text.size() == name.unit.size() ? ':' : ',', key, value);
  }
  return text;
}

class VirtualPort : public Port {
 public:
  VirtualPort(VirtualRigName name, Hertz rate, std::uint64_t seed, const ConverterModel& model)
      : name_(std::move(name)), seed_(seed), model_(model) {
    info_.name = "virtual:" + text_of(name_);
    info_.rate = rate;
    info_.has_reference = model.reference;
    info_.buffer_frames = kBufferFrames;
    // A driver knows its buffers and filters, not the last fraction.
    info_.reported_latency = Seconds(std::floor(model.latency_samples) / rate.value());
    make_chain(0);  // refuses a bad unit, setting, rate or latency now, not at the first take
  }

  const PortInfo& info() const override { return info_; }

  void play(Player& player, int take) override {
    VirtualChain chain = make_chain(take);
    std::vector<float> sent(kBufferFrames), returned(kBufferFrames), reference;
    if (model_.reference) reference.resize(kBufferFrames);
    while (player.process(returned, reference, sent)) chain.process(sent, returned, reference);
  }

 private:
  VirtualChain make_chain(int take) const {
    return VirtualChain(name_, info_.rate, seed_, model_, take, kBufferFrames);
  }

  VirtualRigName name_;
  std::uint64_t seed_;
  ConverterModel model_;
  PortInfo info_;
};

}  // namespace

VirtualRigName parse_virtual_rig(const std::string& text) {
  const std::size_t colon = text.find(':');
  VirtualRigName name{text.substr(0, colon), {}};
  virtual_unit(name.unit);  // refuses an unknown one
  if (colon == std::string::npos) return name;
  for (std::size_t at = colon + 1; at <= text.size();) {
    const std::size_t comma = std::min(text.find(',', at), text.size());
    const std::string setting = text.substr(at, comma - at);
    const std::size_t equals = setting.find('=');
    if (equals == 0 || equals == std::string::npos || equals + 1 == setting.size()) {
      throw UsageError(fmt::format(
          "virtual rig '{}': '{}' is no setting; expected key=value, separated by commas", text,
          setting));
    }
    if (!name.settings.emplace(setting.substr(0, equals), setting.substr(equals + 1)).second) {
      throw UsageError(fmt::format("virtual rig '{}': setting {} is given twice", text,
                                   setting.substr(0, equals)));
    }
    at = comma + 1;
  }
  return name;
}

std::unique_ptr<Port> make_virtual_port(const VirtualRigName& name, Hertz rate, std::uint64_t seed,
                                        const ConverterModel& model) {
  return std::make_unique<VirtualPort>(name, rate, seed, model);
}

Rig virtual_rig(const VirtualRigName& name, Hertz rate, const ConverterModel& model) {
  Rig rig;
  rig.name = fmt::format("virtual rig, {}", text_of(name));
  rig.kind = RigKind::virtual_rig;
  rig.device = "virtual:" + text_of(name);
  if (model.reference) {
    rig.reference_channel = 2;
    rig.reference_tap = "terminals";
  }
  rig.rate = rate;
  rig.send_scale = LevelScale::calibrated(model.full_scale, model.full_scale_u);
  rig.return_scale = rig.send_scale;
  rig.dc_coupled_send = true;
  rig.dc_coupled_return = true;
  rig.wiring = "balanced";
  rig.source_impedance = Ohms(0.0);
  rig.ceiling_dbfs = 0.0;  // nothing sounds in the room
  rig.invented = true;
  return rig;
}

}  // namespace kneeprint
