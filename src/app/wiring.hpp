// The whole arrow on one screen: which part of the settings makes which part of the house. Only this file knows all
// rooms. Thread: control. Everything here may throw Refusal.
#pragma once

#include "app/from_settings.hpp"
#include "control/command_listener.hpp"
#include "engine/engine.hpp"
#include "intake/open_source.hpp"
#include "journal/session_writer.hpp"
#include "live/live_loop.hpp"
#include "outputs/line_board.hpp"
#include "outputs/line_keeper.hpp"
#include "outputs/output.hpp"
#include "outputs/pulse_lines.hpp"
#include "settings/settings.hpp"

#include <functional>
#include <latch>
#include <memory>
#include <string>

namespace millpond {

/// The name, version, build type and compiler of this program.
[[nodiscard]] std::string program_name();

[[nodiscard]] Detector make_detector(const Settings& settings, const Channels& channels, Hertz rate);
/// What a session with these settings listens to. `trials`: it has trials that somebody marks.
[[nodiscard]] OscCommands commands_for(const Settings& settings, bool trials);
/// Starts a watchdog process over these outputs.
[[nodiscard]] LineKeeper make_keeper(const Settings& settings, const std::vector<std::unique_ptr<Output>>& outputs,
                                     LineBoard& board);

/// A session from the first packet to the closed folder: samples -> engine -> pulses, with everything journaled.
class LiveSession {
  public:
    /// Orders the lines low, starts their watchdog, takes the ports, makes the folder; no sample is read yet.
    LiveSession(Settings settings, const std::filesystem::path& settings_file,
                std::function<void(const std::string&)> refused_command);
    ~LiveSession();
    LiveSession(const LiveSession&) = delete;
    LiveSession& operator=(const LiveSession&) = delete;

    /// Commands are taken inside this context.
    [[nodiscard]] boost::asio::io_context& control() noexcept { return control_; }

    void start();
    /// Thread: any.
    void stop() noexcept { loop_.stop(); }
    /// Orders the line low by this thread and faults the session. Thread: control.
    void emergency_stop(const ChangedBy& by) noexcept { loop_.emergency_stop(by); }
    [[nodiscard]] LoopEnd end() const noexcept { return loop_.end(); }
    /// Looks after devices and watchdog, journals what it finds and tells it; call every few tens of ms, from `start`
    /// on.
    void tend(const std::function<void(const std::string&)>& tell);
    /// Waits for the loop, lets the lines fall and closes the folder.
    void finish();

    [[nodiscard]] LiveFigures figures() const { return writer_->snapshot(); }
    [[nodiscard]] const std::filesystem::path& folder() const noexcept { return writer_->folder(); }
    [[nodiscard]] const StreamSettings& stream() const noexcept { return stream_; }
    [[nodiscard]] double delay_ms() noexcept;
    /// Nobody who sees this session may learn its condition.
    [[nodiscard]] bool blinded() const noexcept { return assigned_ && assigned_->kept.sealed; }
    [[nodiscard]] const std::optional<Assigned>& assigned() const noexcept { return assigned_; }

  private:
    class Journal;
    [[nodiscard]] StopDoor stop_door();
    void journal_device(std::size_t output, DeviceState state);

    // Made in this order: what may be refused comes before the session folder, so that a refusal leaves no trace.
    StreamSettings stream_;
    RealtimeSettings realtime_;
    std::vector<OutputSettings> output_settings_;
    std::vector<std::unique_ptr<Output>> outputs_;
    LineBoard board_;
    LineKeeper keeper_; // its process is forked here, before there are other threads and much memory
    Hertz rate_;
    std::optional<Assigned> assigned_;
    Channels channels_;
    Detector detector_; // until the loop's engine takes it
    Schedule schedule_; // likewise
    boost::asio::io_context control_;
    SpscRing<Command> commands_{1024};
    std::unique_ptr<CommandListener> listener_;
    std::unique_ptr<SampleSource> source_;
    std::unique_ptr<SessionWriter> writer_;
    std::unique_ptr<Journal> journal_;
    PulseLines lines_;
    LiveLoop loop_;
    std::latch may_run_{1};
    bool granted_ = false;
    std::thread thread_;
};

} // namespace millpond
