#include "detector/kernel.hpp"

#include <bit>

namespace millpond {
namespace {

// All exponent bits set: infinity or not-a-number. Integer work, so it vectorises and never traps.
constexpr std::uint32_t exponent_bits = 0x7F800000U;

bool is_finite(float value) noexcept {
    return (std::bit_cast<std::uint32_t>(value) & exponent_bits) != exponent_bits;
}

bool looked_at_finite(const float* frame, const KernelState& state) noexcept {
    bool finite = true;
    for (std::size_t input = 0; input < state.inputs; ++input) {
        finite = finite && is_finite(frame[state.channel_of[input]]);
    }
    return finite;
}

bool all_finite(const float* values, std::size_t count) noexcept {
    std::uint32_t bad = 0;
    for (std::size_t i = 0; i < count; ++i) {
        bad |= static_cast<std::uint32_t>(!is_finite(values[i]));
    }
    return bad == 0;
}

} // namespace

std::size_t finite_frames(const float* frames, std::size_t count, const KernelState& state) noexcept {
    if (all_finite(frames, count * state.channels)) {
        return count;
    }
    std::size_t good = 0;
    while (good < count && looked_at_finite(frames + good * state.channels, state)) {
        ++good;
    }
    return good;
}

} // namespace millpond
