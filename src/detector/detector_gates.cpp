// What is looked at beside the lanes: mains, sites, the state; and what gates tell the floor. Thread: loop.
#include "detector/detector_state.hpp"

#include <algorithm>

namespace millpond {

KernelResult Detector::State::run_kernel(const KernelOrder& order) noexcept {
    if (!mains.on()) {
        return kernel(lanes, order);
    }
    mains.begin(position);
    const auto result = kernel(lanes, order);
    mains.end(position + result.frames);
    return result;
}

void Detector::State::watch(const FrameBlock& block) noexcept {
    if (watches_sites()) {
        watch_sites(block);
    }
    if (state_gate.on() && state_gate.take(position, block.data.data(), block.frames(), lanes.channels)) {
        state_changed = !state_changed;
    }
}

std::uint64_t Detector::State::frames_to_verdict() const noexcept {
    std::uint64_t frames = UINT64_MAX;
    if (watches_sites()) {
        frames = site_watch.frames_to_verdict(position);
    }
    if (state_gate.on()) {
        frames = std::min(frames, state_gate.frames_to_verdict(position));
    }
    if (mains.on()) {
        frames = std::min(frames, mains.frames_to_step(position));
    }
    return frames;
}

std::uint64_t Detector::frames_to_verdict() const noexcept {
    return state_->frames_to_verdict();
}

std::optional<bool> Detector::state_gate_change() noexcept {
    auto& s = *state_;
    if (!s.state_changed) {
        return std::nullopt;
    }
    s.state_changed = false;
    return s.state_gate.open();
}

bool Detector::has_state_gate() const noexcept {
    return state_->state_gate.on();
}

bool Detector::state_gate_open() const noexcept {
    return state_->state_gate.open();
}

void Detector::use_memory(bool gates_open) noexcept {
    auto& s = *state_;
    if (gates_open == s.gates_open) {
        return;
    }
    auto& left = s.memories[s.gates_open ? 1 : 0];
    const auto& entered = s.memories[gates_open ? 1 : 0];
    s.gates_open = gates_open;
    if (!s.start.done()) {
        return; // there is nothing to remember yet
    }
    const auto bytes = s.lanes.lanes * sizeof(double);
    __builtin_memcpy(left.mean.data(), s.mean.data(), bytes);
    __builtin_memcpy(left.spread.data(), s.spread.data(), bytes);
    left.frames = s.floor_frames;
    if (entered.frames == 0) {
        s.floor_frames = std::min(s.floor_frames, s.settle_frames);
        return;
    }
    __builtin_memcpy(s.mean.data(), entered.mean.data(), bytes);
    __builtin_memcpy(s.spread.data(), entered.spread.data(), bytes);
    s.floor_frames = entered.frames;
}

} // namespace millpond
