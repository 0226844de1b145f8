#include "journal/journal_drain.hpp"

#include "journal/session_folder.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cerrno>
#include <cstring>
#include <unistd.h>
#include <utility>

namespace millpond {
namespace {

constexpr Nanos latency_period = std::chrono::milliseconds{60};
// NaN for missing frames, in one drain: 32 MB, so that a long gap does not hold up the records.
constexpr std::uint64_t missing_values_a_drain = 8'000'000;

// 4 s of samples ride out a disk that stalls; 64 MB at most, since it is locked into memory.
std::size_t sample_ring_values(const SessionAbout& about) {
    const auto wanted = 4.0 * about.rate.value * static_cast<double>(about.channels.size());
    return static_cast<std::size_t>(std::clamp(wanted, 65536.0, 16777216.0));
}

void pop_all(JournalSink& sink, std::vector<Event>& events) {
    events.clear();
    // Bounded: a producer that never rests must not keep the drain from the disk.
    Event event;
    for (std::size_t taken = 0; taken < 65536 && sink.pop(event); ++taken) {
        events.push_back(event);
    }
}

// Merges by time; the order within each list stays, even where the clock was set back.
void merge_into(std::vector<Event>& merged, const std::vector<Event>& more) {
    if (more.empty()) {
        return;
    }
    const auto old = merged;
    merged.clear();
    auto left = old.begin();
    auto right = more.begin();
    while (left != old.end() || right != more.end()) {
        const bool take_left = right == more.end() || (left != old.end() && left->time_ns <= right->time_ns);
        merged.push_back(take_left ? *left++ : *right++);
    }
}

} // namespace

JournalDrain::JournalDrain(const std::filesystem::path& folder, const SessionSettings& settings,
                           const SessionAbout& about, std::int64_t start_utc_ns)
    : channels_(about.channels.size()),
      records_(folder / records_name, {static_cast<std::uint32_t>(channels_), about.rate, start_utc_ns}) {
    if (settings.store_samples != StoreSamples::none) {
        rings_.samples.emplace(sample_ring_values(about), 65536);
        samples_.emplace(folder / sample_file_name(settings.store_samples), settings.store_samples, about.rate,
                         channels_);
    }
    Event start;
    start.kind = EventKind::session_start;
    start.time_ns = start_utc_ns;
    batch_.assign(1, start);
    write_records();
}

void JournalDrain::watch_disk(const std::filesystem::path& folder, double min_free_mb) {
    std::vector<int> descriptors{records_.descriptor()};
    if (samples_) {
        descriptors.push_back(samples_->descriptor());
    }
    DiskWatch::Tell tell;
    tell.sync_failed = [this](const std::string& what) {
        fail(JournalTrouble::write_failed, "the disk did not take the session: " + what);
    };
    tell.little_space = [this, min_free_mb](std::uint64_t free) {
        little_space_.store(true, std::memory_order_relaxed); // alone; orders nothing
        fail(JournalTrouble::little_space,
             fmt::format("only {} MB of disk space left (session.min_free_mb: {}); samples are no longer stored", free,
                         min_free_mb));
    };
    watch_ = std::make_unique<DiskWatch>(std::move(descriptors), folder, min_free_mb, std::move(tell));
}

void JournalDrain::drain() {
    const auto now = monotonic_now();
    collect_events();
    collect_timings(now);
    counters_.count(batch_, timings_, now);
    collect_dropped();
    write_records();
    store_samples();
    counters_.set_journal(records_.records(), events_dropped_ + records_lost_, frames_dropped_ + frames_lost_, upto_);
}

void JournalDrain::finish(SampleIndex end) {
    ending_ = true;
    latencies_told_ = Nanos{};
    do {
        drain();
    } while (block_waits_);
    upto_ = std::max(upto_, end);
    drain(); // tells what the last one lost
    Event last;
    last.kind = EventKind::session_end;
    last.sample = end;
    last.time_ns = realtime_now().count();
    batch_.assign(1, last);
    write_records();
    counters_.set_journal(records_.records(), events_dropped_ + records_lost_, frames_dropped_ + frames_lost_, upto_);
    watch_.reset();
    ::fdatasync(records_.descriptor());
    samples_.reset(); // brings its header up to date once more
}

void JournalDrain::collect_events() {
    // An effect before its cause: what the loop pushed before the pulse thread answered is then there to be found.
    pop_all(rings_.pulse, pulse_events_);
    pop_all(rings_.control, control_events_);
    pop_all(rings_.loop, loop_events_);
    batch_ = loop_events_;
    merge_into(batch_, pulse_events_);
    merge_into(batch_, control_events_);
    for (const auto& event : batch_) {
        upto_ = std::max(upto_, event.sample);
    }
}

void JournalDrain::collect_timings(Nanos now) {
    timings_.clear();
    PacketTiming timing{};
    for (std::size_t taken = 0; taken < rings_.timings.capacity() && rings_.timings.pop(timing); ++taken) {
        timings_.push_back(timing);
        latencies_.add(timing);
    }
    if (ending_ || now - latencies_told_ >= latency_period) {
        latencies_told_ = now;
        latencies_.flush(upto_, realtime_now().count(), batch_);
    }
}

void JournalDrain::collect_dropped() {
    const auto events = rings_.loop.dropped() + rings_.pulse.dropped() + rings_.control.dropped();
    const auto timings = rings_.timings.dropped();
    add_dropped(Dropped::events, events - std::exchange(events_dropped_, events), upto_);
    add_dropped(Dropped::timings, timings - std::exchange(timings_dropped_, timings), upto_);
    if (rings_.samples) {
        const auto frames = rings_.samples->dropped_frames();
        const auto at = frames_dropped_ == 0 ? rings_.samples->first_dropped() : upto_;
        add_dropped(Dropped::frames, frames - std::exchange(frames_dropped_, frames), at);
    }
    if (events_dropped_ + frames_dropped_ > 0) {
        fail(JournalTrouble::fell_behind, "the journal fell behind and had to drop events or frames");
    }
    // The disk's losses of frames: at once for the place, at the end for the number.
    if (frames_lost_ > frames_lost_told_ && (ending_ || frames_lost_told_ == 0)) {
        add_dropped(Dropped::frames, frames_lost_ - frames_lost_told_, first_frame_lost_);
        frames_lost_told_ = frames_lost_;
    }
}

void JournalDrain::add_dropped(Dropped what, std::uint64_t count, SampleIndex at) {
    if (count > 0) {
        batch_.push_back(Event::make(EventKind::dropped, static_cast<std::uint8_t>(what), at, CountDetail{count}));
        batch_.back().time_ns = realtime_now().count();
    }
}

void JournalDrain::write_records() {
    const bool telling = records_untold_ > 0;
    if (telling) {
        // First, so that it is what fits before anything else does.
        add_dropped(Dropped::events, records_untold_, upto_);
        std::rotate(batch_.begin(), batch_.end() - 1, batch_.end());
    }
    const auto wrote = records_.append(batch_);
    if (telling && wrote.records > 0) {
        records_untold_ = 0;
    }
    if (wrote.records < batch_.size()) {
        const auto lost = batch_.size() - wrote.records - (telling && wrote.records == 0 ? 1 : 0);
        records_lost_ += lost;
        records_untold_ += lost;
        fail_disk(wrote.error, "records");
    }
}

void JournalDrain::store_samples() {
    if (!samples_) {
        return;
    }
    std::uint64_t missing_budget = std::max<std::uint64_t>(1, missing_values_a_drain / channels_);
    while (block_waits_ || rings_.samples->pop(block_first_, block_)) {
        block_waits_ = true;
        if (!store_block(missing_budget)) {
            break;
        }
        block_waits_ = false;
    }
    if (!samples_->update_header()) {
        fail_disk(samples_->error(), "samples");
    }
}

// False where the block has to wait for the next drain.
bool JournalDrain::store_block(std::uint64_t& missing_budget) {
    const auto frames = block_.size() / channels_;
    upto_ = std::max(upto_, block_first_ + frames);
    if (frames_lost_ > 0 || little_space_.load(std::memory_order_relaxed)) {
        lose_frames(frames, block_first_);
        return true;
    }
    if (block_first_.value < samples_->frames()) {
        lose_frames(frames, block_first_); // cannot come from an engine that counts upwards
        return true;
    }
    const auto missing = std::min(block_first_.value - samples_->frames(), missing_budget);
    missing_budget -= missing;
    if (!samples_->write_missing(missing)) {
        lose_frames(frames, SampleIndex{samples_->frames()});
        fail_disk(samples_->error(), "samples");
        return true;
    }
    if (samples_->frames() < block_first_.value) {
        return false;
    }
    if (!samples_->write(block_)) {
        lose_frames(frames, SampleIndex{samples_->frames()});
        fail_disk(samples_->error(), "samples");
    }
    return true;
}

void JournalDrain::lose_frames(std::uint64_t frames, SampleIndex at) {
    if (frames_lost_ == 0) {
        first_frame_lost_ = at;
    }
    frames_lost_ += frames;
}

void JournalDrain::fail_disk(int error, const char* file) {
    const bool full = error == ENOSPC || error == EDQUOT || error == EFBIG;
    fail(full ? JournalTrouble::disk_full : JournalTrouble::write_failed,
         fmt::format("the disk did not take the session's {}: {}", file, std::strerror(error)));
}

void JournalDrain::fail(JournalTrouble trouble, const std::string& what) {
    auto none = JournalTrouble::none;
    // The first trouble stays. Release: who sees the flag may act on it; nothing else hangs on it.
    if (trouble_.compare_exchange_strong(none, trouble, std::memory_order_release, std::memory_order_relaxed)) {
        counters_.set_trouble(what);
    }
}

} // namespace millpond
