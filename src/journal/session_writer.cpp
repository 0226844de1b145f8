#include "journal/session_writer.hpp"

#include "journal/journal_drain.hpp"
#include "journal/session_folder.hpp"
#include "journal/session_reader.hpp"
#include "journal/session_tables.hpp"
#include "recording/sidecar.hpp"

#include <chrono>
#include <condition_variable>
#include <mutex>
#include <thread>

namespace millpond {
namespace {

constexpr std::chrono::milliseconds drain_period{20};

} // namespace

struct SessionWriter::State {
    std::filesystem::path folder;
    std::unique_ptr<JournalDrain> drain;
    std::mutex mutex;
    std::condition_variable wake;
    bool stopping = false, closed = false, blinded = false;
    std::thread thread;

    void run() {
        auto next = std::chrono::steady_clock::now();
        std::unique_lock lock(mutex);
        while (!stopping) {
            lock.unlock();
            drain->drain();
            next = std::max(next + drain_period, std::chrono::steady_clock::now());
            lock.lock();
            wake.wait_until(lock, next, [this] { return stopping; });
        }
    }

    void stop() {
        {
            const std::lock_guard lock(mutex);
            stopping = true;
        }
        wake.notify_all();
        if (thread.joinable()) {
            thread.join();
        }
    }
};

SessionWriter::SessionWriter(std::unique_ptr<State> state) noexcept : state_(std::move(state)) {}

std::unique_ptr<SessionWriter> SessionWriter::open(const SessionSettings& settings, const SessionAbout& about) {
    const auto start_ns = realtime_now().count();
    NewSessionFolder folder(settings, start_ns);
    folder.write_text(settings_name, about.settings_text);
    folder.write_text(provenance_name, to_json(gather_provenance(about, start_ns)).dump(2) + "\n");
    if (settings.store_samples != StoreSamples::none) {
        // So that every command that takes a recording takes the session's samples too, by their names and roles.
        write_sidecar(sidecar_path(folder.working() / sample_file_name(settings.store_samples)),
                      {.microvolts_per_count = 1.0, .channels = about.channels});
    }
    auto state = std::make_unique<State>();
    state->drain = std::make_unique<JournalDrain>(folder.working(), settings, about, start_ns);
    state->blinded = about.blinded;
    state->folder = folder.commit();
    state->drain->watch_disk(state->folder, settings.min_free_mb);
    state->thread = std::thread([raw = state.get()] { raw->run(); });
    return std::unique_ptr<SessionWriter>(new SessionWriter(std::move(state)));
}

SessionWriter::~SessionWriter() {
    state_->stop();
    if (!state_->closed) {
        state_->drain->drain();
    }
}

JournalSink& SessionWriter::loop_sink() noexcept {
    return state_->drain->rings().loop;
}

JournalSink& SessionWriter::pulse_sink() noexcept {
    return state_->drain->rings().pulse;
}

JournalSink& SessionWriter::control_sink() noexcept {
    return state_->drain->rings().control;
}

void SessionWriter::store(const FrameBlock& block) noexcept {
    if (auto& samples = state_->drain->rings().samples) {
        samples->push(block);
    }
}

void SessionWriter::time_packet(const PacketTiming& timing) noexcept {
    state_->drain->rings().timings.push(timing);
}

JournalTrouble SessionWriter::trouble() const noexcept {
    return state_->drain->trouble();
}

LiveFigures SessionWriter::snapshot() const {
    return state_->drain->figures();
}

const std::filesystem::path& SessionWriter::folder() const noexcept {
    return state_->folder;
}

void SessionWriter::close(SampleIndex end) {
    state_->stop();
    state_->closed = true;
    state_->drain->finish(end);
    write_session_tables(SessionReader(state_->folder), state_->folder, state_->blinded);
}

} // namespace millpond
