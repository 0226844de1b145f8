#include "intake/pipe_source.hpp"

#include "base/clock.hpp"

#include <algorithm>
#include <cerrno>
#include <cstring>
#include <poll.h>
#include <unistd.h>

namespace millpond {
namespace {

constexpr std::size_t greatest_read_bytes = 65536; // what a Linux pipe holds
constexpr double greatest_block_s = 0.1;
// A file poured in at once would run the journal over; no rig is this much faster than its own clock.
constexpr double greatest_pace = 8.0;
constexpr Nanos head_start{250'000'000};

} // namespace

PipeSource::PipeSource(const StreamSettings& settings, int descriptor)
    : descriptor_(descriptor), rate_{settings.rate_hz}, channels_(settings.channels), encoding_(settings.encoding),
      microvolts_per_count_(static_cast<float>(settings.microvolts_per_count)),
      frame_bytes_(channels_ * bytes_per_sample(encoding_)) {
    const auto frames = std::clamp<std::size_t>(static_cast<std::size_t>(greatest_block_s * rate_.value), 1,
                                                greatest_read_bytes / frame_bytes_);
    bytes_.resize(frames * frame_bytes_);
    samples_.resize(frames * channels_);
}

// A signal may end the wait early. A read that brings less than a frame waits on within the same timeout.
Received PipeSource::receive(Nanos timeout, Arrival& arrival) noexcept {
    arrival.counts_changed = false;
    keep_rest();
    if (hold_back(timeout)) {
        return Received::nothing;
    }
    const Nanos until = monotonic_now() + timeout;
    for (Nanos wait = timeout; !ended_; wait = until - monotonic_now()) {
        pollfd readable{descriptor_, POLLIN, 0};
        wait = std::max(Nanos{0}, wait);
        const timespec time{wait.count() / 1'000'000'000, wait.count() % 1'000'000'000};
        if (const int found = ppoll(&readable, 1, &time, nullptr); found <= 0) {
            return found == 0 || errno == EINTR ? Received::nothing : Received::failed;
        }
        const ssize_t bytes = read(descriptor_, bytes_.data() + filled_, bytes_.size() - filled_);
        if (bytes < 0) {
            return errno == EINTR || errno == EAGAIN ? Received::nothing : Received::failed;
        }
        if (bytes == 0) {
            return finish(arrival);
        }
        filled_ += static_cast<std::size_t>(bytes);
        if (filled_ >= frame_bytes_) {
            hand_out(arrival);
            return Received::frames;
        }
    }
    return Received::ended;
}

// Sleeps, at most `timeout`, while the samples run too far ahead of the clock. True: they still may.
bool PipeSource::hold_back(Nanos timeout) noexcept {
    const Nanos now = monotonic_now();
    if (next_ == SampleIndex{0}) {
        began_ = now;
    }
    const Nanos due{static_cast<std::int64_t>(seconds_at(next_, rate_) / greatest_pace * 1e9)};
    const Nanos ahead = began_ + due - head_start - now;
    if (ahead <= Nanos{0}) {
        return false;
    }
    const Nanos wait = std::min(ahead, timeout);
    const timespec time{wait.count() / 1'000'000'000, wait.count() % 1'000'000'000};
    nanosleep(&time, nullptr);
    return true;
}

Received PipeSource::finish(Arrival& arrival) noexcept {
    ended_ = true;
    if (filled_ > 0) {
        ++counts_[static_cast<std::size_t>(PacketCause::truncated)];
        arrival.counts_changed = true;
    }
    return Received::ended;
}

void PipeSource::hand_out(Arrival& arrival) noexcept {
    const std::size_t frames = filled_ / frame_bytes_;
    used_ = frames * frame_bytes_;
    const std::span<float> samples(samples_.data(), frames * channels_);
    decode_samples(encoding_, {bytes_.data(), used_}, microvolts_per_count_, samples);
    arrival.block = {next_, channels_, samples};
    arrival.arrived_ns = 0;
    arrival.sent_ns = 0;
    next_ = next_ + frames;
    ++counts_[static_cast<std::size_t>(PacketCause::accepted)];
}

void PipeSource::keep_rest() noexcept {
    filled_ -= used_;
    std::memmove(bytes_.data(), bytes_.data() + used_, filled_);
    used_ = 0;
}

} // namespace millpond
