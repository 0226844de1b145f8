#include "app/wiring.hpp"

#include "app/from_settings.hpp"
#include "journal/session_reader.hpp"
#include "outputs/crash_guard.hpp"
#include "outputs/make_output.hpp"
#include "realtime/realtime.hpp"
#include "stimulus/stimulus.hpp"

#include <algorithm>

namespace millpond {
namespace {

std::string word_of(KernelWidth width) {
    switch (width) {
    case KernelWidth::avx512:
        return "avx512";
    case KernelWidth::avx2:
        return "avx2";
    default:
        return "sse2";
    }
}

LiveLoopSettings loop_settings(const Settings& settings, const StreamSettings& stream) {
    return {Nanos{static_cast<std::int64_t>(stream.stale_after_ms * 1e6)}, settings.realtime.spin,
            settings.arbiter.start_armed, settings.arbiter.speed_gate};
}

// What a session keeps of its settings: all but the secret, which is nobody's evidence.
std::string settings_to_keep(Settings settings, const StreamSettings& stream, const Channels& channels) {
    settings.stream = stream;
    settings.channels = channels;
    if (!settings.control.secret.empty()) {
        settings.control.secret = "(not kept in the session folder)";
    }
    return settings_to_yaml(settings);
}

// Figures and warnings, as they stood when the session began.
void keep_stimulus(const StimulusSettings& stimulus, nlohmann::json& more) {
    if (const auto figures = stimulus_figures(stimulus)) {
        more["stimulus"] = {{"current_ua", stimulus.current_ua},
                            {"phase_us", stimulus.phase_us},
                            {"phases", stimulus.phases},
                            {"area_um2", figures->area_um2},
                            {"charge_per_phase_uc", figures->charge_uc},
                            {"charge_density_uc_cm2", figures->density_uc_cm2},
                            {"shannon_k", figures->shannon_k},
                            {"text", told(*figures)},
                            {"warnings", stimulus_warnings(*figures)}};
    }
}

SessionAbout about(const Settings& settings, const std::optional<Assigned>& assigned, const StreamSettings& stream,
                   const Channels& channels, Detector& detector) {
    SessionAbout about;
    about.program = program_name();
    about.rate = Hertz{stream.rate_hz};
    about.channels = channels;
    about.floor_count = static_cast<std::uint32_t>(detector.floor_count());
    about.kernel_width = word_of(detector.width());
    about.filter_delay_samples = detector.filter_delay_samples();
    about.delay_samples = detector.delay_samples();
    if (!settings.detector.floor.warm_start_session.empty()) {
        // As they were given: the detector's own words about them may differ in the last bit.
        about.warm_start = last_floors(SessionReader(settings.detector.floor.warm_start_session).events());
    }
    if (assigned) {
        about.blinded = assigned->kept.sealed;
        about.more["assignment"] = nlohmann::json::parse(to_json_text(assigned->kept));
    }
    about.settings_text = settings_to_keep(settings, stream, channels);
    keep_stimulus(settings.stimulus, about.more);
    if (settings.arbiter.speed_gate.on) {
        about.more["speed_gate_delay_ms"] = settings.arbiter.speed_gate.delay_ms;
    }
    return about;
}

std::vector<std::string> gate_names(const ArbiterSettings& arbiter) {
    std::vector<std::string> names;
    for (const auto& gate : arbiter.gates) {
        names.push_back(gate.name);
    }
    return names;
}

// As an order names it; the word was checked with the settings.
std::uint8_t condition_number(const std::string& word) {
    for (const auto& choice : conditions) {
        if (choice.word == word) {
            return static_cast<std::uint8_t>(choice.value);
        }
    }
    return any_condition;
}

std::vector<PulseLinePlan> line_plans(const std::vector<OutputSettings>& settings,
                                      const std::vector<std::unique_ptr<Output>>& outputs) {
    std::vector<PulseLinePlan> plans;
    for (std::size_t i = 0; i < outputs.size(); ++i) {
        plans.push_back(
            {outputs[i].get(), pulse_shape(settings[i]), settings[i].follows, condition_number(settings[i].condition)});
    }
    return plans;
}

// Locks memory and makes sure that the loop's rights will be had when the session starts.
RealtimeSettings granted(const RealtimeSettings& settings) {
    lock_memory(settings);
    std::thread trial([] {});
    try {
        make_realtime(trial, settings);
    } catch (...) {
        trial.join();
        throw;
    }
    trial.join();
    return settings;
}

bool has_trials(const std::optional<Assigned>& assigned) {
    return assigned && assigned->kept.unit == AssignmentUnit::trial;
}

} // namespace

OscCommands commands_for(const Settings& settings, bool trials) {
    return {settings.control.secret,
            gate_names(settings.arbiter),
            {trials, !settings.arbiter.plan.epochs.empty(), settings.arbiter.speed_gate.on}};
}

namespace {

std::unique_ptr<CommandListener> listen(const Settings& settings, bool trials, boost::asio::io_context& context,
                                        CommandRing& commands, StopDoor door,
                                        std::function<void(const std::string&)> refused) {
    if (!settings.control.listen) {
        return nullptr;
    }
    return std::make_unique<CommandListener>(context, settings.control, commands_for(settings, trials), commands,
                                             std::move(door), std::move(refused));
}

} // namespace

std::string program_name() {
    return MILLPOND_VERSION;
}

Detector make_detector(const Settings& settings, const Channels& channels, Hertz rate) {
    auto detector = Detector::make(settings.detector, channels, rate);
    if (const auto floors = warm_start_floors(settings.detector); !floors.empty()) {
        detector.warm_start(floors);
    }
    check_floor_channels(settings.arbiter.limits.floor, detector);
    return detector;
}

LineKeeper make_keeper(const Settings& settings, const std::vector<std::unique_ptr<Output>>& outputs,
                       LineBoard& board) {
    std::vector<WatchedLine> lines;
    for (std::size_t i = 0; i < outputs.size(); ++i) {
        lines.push_back({outputs[i].get(), longest_high(settings.outputs[i])});
    }
    // Above the loop, which may be what stands still.
    const int priority = settings.realtime.priority > 0 ? std::min(settings.realtime.priority + 1, 99) : 0;
    return {std::move(lines), board, {priority, settings.realtime.lock_memory}};
}

/// The session writer as the loop knows it.
class LiveSession::Journal : public LoopJournal {
  public:
    explicit Journal(SessionWriter& writer) : writer_(writer) {}
    void take(const Event& event) noexcept override { writer_.loop_sink().take(event); }
    void store(const FrameBlock& block) noexcept override { writer_.store(block); }
    void time_packet(std::int64_t transport_ns, std::int64_t wake_ns, std::int64_t loop_ns) noexcept override {
        writer_.time_packet({transport_ns, wake_ns, loop_ns});
    }
    [[nodiscard]] bool failed() const noexcept override { return writer_.failed(); }

  private:
    SessionWriter& writer_;
};

LiveSession::LiveSession(Settings settings, const std::filesystem::path& settings_file,
                         std::function<void(const std::string&)> refused_command)
    : stream_(resolved(settings.stream, settings_file)), realtime_(granted(settings.realtime)),
      output_settings_(settings.outputs), outputs_(make_outputs(settings.outputs)),
      keeper_(make_keeper(settings, outputs_, board_)), rate_{stream_.rate_hz},
      assigned_(assigned_for(settings, rate_, settings_file.string())),
      channels_(channels_for(settings, ripple_channels(stream_.channels), settings_file.string())),
      detector_(make_detector(settings, channels_, rate_)), schedule_(schedule_for(settings.arbiter, rate_)),
      listener_(listen(settings, has_trials(assigned_), control_, commands_, stop_door(), std::move(refused_command))),
      source_(open_source(stream_)),
      writer_(SessionWriter::open(settings.session, about(settings, assigned_, stream_, channels_, detector_))),
      journal_(std::make_unique<Journal>(*writer_)),
      lines_(line_plans(output_settings_, outputs_), board_, writer_->pulse_sink(), settings.realtime.priority),
      loop_(loop_settings(settings, stream_), *source_, lines_, *journal_, commands_,
            [&](EventSink& sink, PulsePort& port) {
                Engine engine(std::move(detector_), settings.arbiter, std::move(schedule_), rate_, sink, port);
                if (assigned_) {
                    engine.assign(assigned_->list, assigned_->block_frames);
                }
                return engine;
            }) {
    std::vector<Output*> guarded;
    for (std::size_t i = 0; i < outputs_.size(); ++i) {
        guarded.push_back(outputs_[i].get());
        journal_device(i, DeviceState::ready);
    }
    guard_lines_against_crashes(guarded);
}

// The loop is made after the listener; nothing is heard before both are.
StopDoor LiveSession::stop_door() {
    return {[this](const ChangedBy& by) { loop_.emergency_stop(by); }, [this] { return loop_.emergency_stopped(); },
            [this] { loop_.clear_emergency_stop(); }};
}

LiveSession::~LiveSession() {
    if (thread_.joinable()) {
        loop_.stop();
        thread_.join();
    }
    guard_lines_against_crashes({});
}

void LiveSession::start() {
    thread_ = std::thread([this] {
        may_run_.wait();
        if (granted_) {
            loop_.run();
        }
    });
    try {
        make_realtime(thread_, realtime_);
        granted_ = true;
    } catch (...) {
        may_run_.count_down();
        thread_.join();
        throw;
    }
    may_run_.count_down();
}

void LiveSession::tend(const std::function<void(const std::string&)>& tell) {
    keeper_.look(lines_,
                 {[&](std::size_t output, DeviceState state) {
                      journal_device(output, state);
                      tell(state == DeviceState::lost
                               ? "output " + output_settings_[output].name + " is lost; it is tried every second"
                               : "output " + output_settings_[output].name +
                                     " is back, its line ordered low; arm again when you are ready");
                  },
                  [&](bool watched) {
                      tell(watched ? "another watchdog has taken over; arm again when you are ready"
                                   : "the watchdog of the lines was lost");
                  }});
}

void LiveSession::journal_device(std::size_t output, DeviceState state) {
    const auto& settings = output_settings_[output];
    DeviceDetail detail{static_cast<std::uint16_t>(output),
                        static_cast<std::uint16_t>(settings.follows == Follows::trigger ? 1 : 0),
                        {}};
    settings.name.copy(detail.name.data(), detail.name.size() - 1);
    writer_->control_sink().take(
        Event::make(EventKind::device, static_cast<std::uint8_t>(state), writer_->snapshot().upto, detail));
}

void LiveSession::finish() {
    loop_.stop();
    if (thread_.joinable()) {
        thread_.join();
    }
    lines_.fall_now();
    writer_->close(loop_.engine().next_sample());
}

double LiveSession::delay_ms() noexcept {
    return loop_.engine().detector().delay_samples() / rate_.value * 1000.0;
}

} // namespace millpond
