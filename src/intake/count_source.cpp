#include "intake/count_source.hpp"

#include "base/clock.hpp"

#include <algorithm>
#include <cerrno>
#include <cstring>
#include <poll.h>
#include <unistd.h>

namespace millpond {
namespace {

constexpr std::size_t greatest_read_bytes = 65536;
constexpr double greatest_block_s = 0.1;

} // namespace

CountSource::CountSource(CountFormat format, int descriptor)
    : format_(std::move(format)), descriptor_(descriptor),
      frame_bytes_(format_.channels.size() * format_.bytes_per_sample) {
    const auto frames = std::clamp<std::size_t>(static_cast<std::size_t>(greatest_block_s * format_.rate.value), 1,
                                                greatest_read_bytes / frame_bytes_);
    bytes_.resize(frames * frame_bytes_);
    samples_.resize(frames * format_.channels.size());
}

Received CountSource::receive(Nanos timeout, Arrival& arrival) noexcept {
    arrival.counts_changed = false;
    keep_rest();
    const Nanos until = monotonic_now() + timeout;
    for (Nanos wait = timeout;; wait = std::max(Nanos{0}, until - monotonic_now())) {
        pollfd readable{descriptor_, POLLIN, 0};
        const timespec time{wait.count() / 1'000'000'000, wait.count() % 1'000'000'000};
        if (const int found = ppoll(&readable, 1, &time, nullptr); found <= 0) {
            return found == 0 || errno == EINTR ? Received::nothing : Received::failed;
        }
        const ssize_t bytes = read(descriptor_, bytes_.data() + filled_, bytes_.size() - filled_);
        if (bytes < 0 && (errno == EINTR || errno == EAGAIN)) {
            return Received::nothing;
        }
        if (bytes <= 0) {
            return bytes == 0 ? Received::ended : Received::failed;
        }
        filled_ += static_cast<std::size_t>(bytes);
        if (filled_ >= frame_bytes_) {
            hand_out(arrival);
            return Received::frames;
        }
    }
}

void CountSource::hand_out(Arrival& arrival) noexcept {
    const std::size_t channels = format_.channels.size(), frames = filled_ / frame_bytes_;
    used_ = frames * frame_bytes_;
    for (std::size_t i = 0; i < frames * channels; ++i) {
        std::uint32_t count = 0;
        if (format_.bytes_per_sample == 2) {
            std::uint16_t half = 0;
            std::memcpy(&half, bytes_.data() + 2 * i, 2);
            count = half;
        } else {
            std::memcpy(&count, bytes_.data() + 4 * i, 4);
        }
        const auto& scale = format_.channels[i % channels];
        samples_[i] = scale.least_uv + scale.step_uv * static_cast<float>(count);
    }
    arrival.block = {next_, channels, std::span<const float>(samples_.data(), frames * channels)};
    arrival.arrived_ns = 0;
    arrival.sent_ns = 0;
    next_ = next_ + frames;
    ++counts_[static_cast<std::size_t>(PacketCause::accepted)];
}

void CountSource::keep_rest() noexcept {
    filled_ -= used_;
    std::memmove(bytes_.data(), bytes_.data() + used_, filled_);
    used_ = 0;
}

} // namespace millpond
