// Any run of packets: places only ever grow, and every buffer comes back exactly once.
#include "intake/stream_order.hpp"

#include <cstdlib>
#include <cstring>
#include <vector>

namespace {

using namespace millpond;

constexpr std::size_t held_at_most = 4;

struct Step {
    std::uint8_t ssrc, frames;
    std::uint16_t sequence, milliseconds;
    std::uint32_t timestamp;
};

void require(bool truth) {
    if (!truth) {
        std::abort();
    }
}

void pop_all(StreamOrder& order, Nanos now, std::vector<std::uint32_t>& free) {
    SampleIndex end = order.next_sample();
    for (StreamOrder::Ready ready; order.pop(now, ready); end = order.next_sample()) {
        require(ready.first >= end && order.next_sample() > ready.first);
        free.push_back(ready.buffer);
    }
    for (std::uint32_t freed = 0; order.take_freed(freed);) {
        free.push_back(freed);
    }
    require(free.size() <= held_at_most + 2);
}

} // namespace

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    PacketCounts counts{};
    StreamOrder order({Hertz{1000.0}, std::chrono::milliseconds{size % 3 * 20}, std::chrono::seconds{1}, held_at_most},
                      counts);
    std::vector<std::uint32_t> free{0, 1, 2, 3, 4, 5};
    Nanos now{0};
    for (; size >= sizeof(Step); data += sizeof(Step), size -= sizeof(Step)) {
        Step step;
        std::memcpy(&step, data, sizeof step);
        now += std::chrono::milliseconds{step.milliseconds % 1500};
        require(!free.empty());
        const std::uint32_t buffer = free.back();
        if (order.offer({step.ssrc % 2U, step.sequence, step.timestamp, step.frames + 1U, now}, buffer) ==
            StreamOrder::Offer::held) {
            free.pop_back();
        }
        pop_all(order, now, free);
    }
    pop_all(order, now + std::chrono::hours{1}, free);
    require(free.size() >= held_at_most + 1); // all but a candidate
    return 0;
}
