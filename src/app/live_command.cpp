// millpond live: a session on a rig, until the operator ends it.
#include "app/commands.hpp"
#include "app/limits_findings.hpp"
#include "app/status_line.hpp"
#include "app/wiring.hpp"
#include "base/clock.hpp"
#include "stimulus/stimulus.hpp"

#include <CLI/CLI.hpp>
#include <boost/asio/signal_set.hpp>
#include <boost/asio/steady_timer.hpp>
#include <fmt/format.h>
#include <spdlog/sinks/basic_file_sink.h>
#include <spdlog/sinks/stdout_sinks.h>
#include <spdlog/spdlog.h>

#include <csignal>
#include <cstdio>
#include <map>
#include <memory>
#include <optional>
#include <random>
#include <unistd.h>

namespace millpond {
namespace {

struct LiveOptions {
    std::string settings_file;
    std::optional<Condition> condition;
    std::string schedule_file, assignment_file, code;
    bool start_armed = false;
    double stop_after_s = 0.0;
    double status_every_s = 0.0;
};

/// What the operator reads: on the terminal as it happens, and kept in the session folder.
std::shared_ptr<spdlog::logger> operators_log(const std::filesystem::path& folder) {
    auto terminal = std::make_shared<spdlog::sinks::stderr_sink_mt>();
    terminal->set_pattern("millpond: %v");
    auto file = std::make_shared<spdlog::sinks::basic_file_sink_mt>((folder / "log.txt").string());
    file->set_pattern("%Y-%m-%dT%H:%M:%S.%e%z %l %v");
    auto log = std::make_shared<spdlog::logger>("millpond", spdlog::sinks_init_list{terminal, file});
    log->flush_on(spdlog::level::info);
    return log;
}

/// Watches a session from the control thread: signals, the time to stop, the status line, what changed.
class Operator {
  public:
    Operator(LiveSession& session, const LiveOptions& options, std::shared_ptr<spdlog::logger> log)
        : session_(session), options_(options), log_(std::move(log)),
          signals_(session.control(), SIGINT, SIGTERM, SIGHUP), stop_signal_(session.control(), SIGUSR1),
          timer_(session.control()), terminal_(isatty(STDERR_FILENO) != 0),
          status_every_(options.status_every_s > 0.0 ? options.status_every_s
                        : terminal_                  ? 0.5
                                                     : 10.0) {}

    /// Until the session is over.
    void watch() {
        signals_.async_wait([this](const boost::system::error_code& trouble, int signal) {
            if (!trouble) {
                leave_status();
                log_->info("ending the session (signal {})", signal);
                session_.stop();
            }
        });
        wait_for_stop_signal();
        tick();
        session_.control().run();
        leave_status();
    }

  private:
    void wait_for_stop_signal() {
        stop_signal_.async_wait([this](const boost::system::error_code& trouble, int /*signal*/) {
            if (!trouble) {
                session_.emergency_stop({ChangeSource::signal});
                leave_status();
                log_->warn("emergency stop (SIGUSR1); /clear, then /arm, when all is safe");
                wait_for_stop_signal();
            }
        });
    }

    void tick() {
        session_.tend([this](const std::string& news) {
            leave_status();
            log_->warn("{}", news);
        });
        const auto figures = session_.figures();
        tell_changes(figures);
        const double running_s = static_cast<double>((monotonic_now() - began_).count()) / 1e9;
        if (running_s >= next_status_s_) {
            show(figures);
            next_status_s_ = running_s + status_every_;
        }
        if (options_.stop_after_s > 0.0 && running_s >= options_.stop_after_s) {
            session_.stop();
        }
        if (session_.end() != LoopEnd::running) {
            session_.control().stop();
            return;
        }
        timer_.expires_after(std::chrono::milliseconds(20));
        timer_.async_wait([this](const boost::system::error_code& trouble) {
            if (!trouble) {
                tick();
            }
        });
    }

    void tell_changes(const LiveFigures& figures) {
        if (figures.state != state_) {
            leave_status();
            log_->warn("{} ({})", name_of(figures.state), name_of(figures.state_cause));
            state_ = figures.state;
        }
        if (figures.epoch && (!epoch_ || figures.epoch->index != *epoch_)) {
            leave_status();
            log_->info("epoch: {}{}", figures.epoch->name, figures.epoch->pulses ? "" : " (no pulses)");
            epoch_ = figures.epoch->index;
        }
        if (figures.sites_out != sites_out_) {
            leave_status();
            tell_sites(figures.sites_out);
            sites_out_ = figures.sites_out;
        }
        if (figures.trouble != trouble_) {
            leave_status();
            log_->error("{}", figures.trouble);
            trouble_ = figures.trouble;
        }
    }

    void tell_sites(const std::vector<std::pair<std::uint16_t, SiteState>>& out) {
        for (const auto& [channel, state] : out) {
            log_->warn("channel {} is {}: left out of the evidence", channel + 1, name_of(state));
        }
        if (out.empty()) {
            log_->warn("all channels are in the evidence again");
        }
    }

    void show(const LiveFigures& figures) {
        const auto line = status_line(figures, Hertz{session_.stream().rate_hz}, session_.blinded());
        // On a terminal the line is written over itself; the rest of an older, longer one is cleared.
        std::fprintf(stderr, terminal_ ? "\r%s\033[K" : "%s\n", line.c_str());
        std::fflush(stderr);
        status_shown_ = terminal_;
    }

    void leave_status() {
        if (status_shown_) {
            std::fputc('\n', stderr);
            status_shown_ = false;
        }
    }

    LiveSession& session_;
    const LiveOptions& options_;
    std::shared_ptr<spdlog::logger> log_;
    boost::asio::signal_set signals_;
    boost::asio::signal_set stop_signal_;
    boost::asio::steady_timer timer_;
    bool terminal_;
    double status_every_;
    Nanos began_ = monotonic_now();
    double next_status_s_ = 0.0;
    bool status_shown_ = false;
    ArmState state_ = ArmState::not_armed;
    std::optional<std::uint16_t> epoch_;
    std::vector<std::pair<std::uint16_t, SiteState>> sites_out_;
    std::string trouble_;
};

void print_summary(const LiveSession& session) {
    const auto figures = session.figures();
    fmt::print("session: {}\n", session.folder().string());
    fmt::print("signal: {:.1f} s, {} gaps with {} frames missing\n",
               seconds_at(figures.upto, Hertz{session.stream().rate_hz}), figures.gaps, figures.frames_missing);
    fmt::print("detections: {}, triggers: {}", figures.detections, figures.triggers);
    session.blinded() ? fmt::print("\n") : fmt::print(", pulses: {}\n", figures.pulses);
    for (std::size_t rule = 0; rule < figures.withheld.size(); ++rule) {
        if (figures.withheld[rule] > 0) {
            fmt::print("withheld, {}: {}\n", name_of(static_cast<Rule>(rule)), figures.withheld[rule]);
        }
    }
    fmt::print("next: millpond audit {}\n", session.folder().string());
}

void tell_limits(const Settings& settings, spdlog::logger& log) {
    if (const auto figures = stimulus_figures(settings.stimulus)) {
        log.info("stimulus: {}", told(*figures));
        for (const auto& warning : stimulus_warnings(*figures)) {
            log.warn("stimulus: {}", warning);
        }
    }
    if (const auto& gate = settings.arbiter.speed_gate; gate.on) {
        log.info("gate speed: {}", told(gate));
    }
}

void tell_assignment(const LiveSession& session, spdlog::logger& log) {
    if (const auto& assigned = session.assigned()) {
        log.info("session {} of the list: {} {}(s){}", assigned->kept.code, assigned->kept.units,
                 word_for<AssignmentUnit>(assignment_units, assigned->kept.unit),
                 assigned->kept.sealed ? "; the condition is sealed" : "");
    }
}

void run_live(const LiveOptions& options) {
    std::signal(SIGPIPE, SIG_IGN);
    std::signal(SIGXFSZ, SIG_IGN); // a file too large is a full disk to the journal, not the end of the program
    auto settings = load_settings(options.settings_file);
    settings.arbiter.start_armed = settings.arbiter.start_armed || options.start_armed;
    settings.arbiter.condition = options.condition.value_or(settings.arbiter.condition);
    if (!options.schedule_file.empty()) {
        settings.arbiter.schedule_file = std::filesystem::absolute(options.schedule_file).string();
    }
    if (!options.assignment_file.empty()) {
        settings.assignment.file = std::filesystem::absolute(options.assignment_file).string();
        settings.arbiter.condition = options.condition.value_or(Condition::assigned);
    }
    settings.assignment.code = options.code.empty() ? settings.assignment.code : options.code;
    if (settings.arbiter.seed == 0) {
        settings.arbiter.seed = std::random_device{}() + std::uint64_t{1};
    }
    check_settings(settings, "command line");
    std::shared_ptr<spdlog::logger> log;
    LiveSession session(settings, options.settings_file, [&log](const std::string& line) { log->warn("{}", line); });
    log = operators_log(session.folder());
    log->info("{}", program_name());
    log->info("session folder {}", session.folder().string());
    log->info(
        "{} channels at {} Hz; the detector itself takes {:.1f} ms (group delay at the band's centre, and smoothing)",
        session.stream().channels, session.stream().rate_hz, session.delay_ms());
    tell_assignment(session, *log);
    log->info(
        "pulse only under the approved protocol and local rules; ask the licensed veterinarian. Ctrl-C ends, line low");
    tell_limits(settings, *log);
    Operator watching(session, options, log);
    session.start();
    watching.watch();
    session.finish();
    if (session.end() == LoopEnd::failed) {
        log->error("the stream failed");
    } else if (session.end() == LoopEnd::planned) {
        log->info("the plan is over");
    }
    print_summary(session);
    if (session.end() == LoopEnd::failed || !session.figures().trouble.empty()) {
        throw std::runtime_error("the session ended in trouble; see log.txt in its folder");
    }
}

} // namespace

void add_live_command(CLI::App& program) {
    auto* command = program.add_subcommand("live", "run a session: samples in, pulses out, everything journaled\n"
                                                   "Samples should come at real pace, by a pipe too (ffmpeg: -re)");
    auto options = std::make_shared<LiveOptions>();
    command->add_option("SETTINGS", options->settings_file, "settings file")->required();
    command->add_flag("--start-armed", options->start_armed,
                      "allow pulses from the start, as arbiter.start_armed does");
    std::map<std::string, Condition> words;
    for (const auto& choice : conditions) {
        words.emplace(choice.word, choice.value);
    }
    command->add_option("--condition", options->condition, "what becomes of triggers, in place of arbiter.condition")
        ->transform(CLI::CheckedTransformer(words).description("{disrupt,delayed,yoked,rate_matched,none,assigned}"));
    command->add_option(
        "--schedule", options->schedule_file,
        "control schedule, in place of arbiter.schedule_file: pulses at its places where the condition\n"
        "is yoked or rate_matched, else blanking alone");
    command->add_option("--assignment", options->assignment_file,
                        "list of conditions made by `assign`, in place of assignment.file");
    command->add_option("--code", options->code, "which session of that list this one is");
    command->add_option("--stop-after-s", options->stop_after_s, "end by itself after this many seconds; 0: never")
        ->check(CLI::Range(0.0, 1e7));
    command
        ->add_option("--status-every-s", options->status_every_s,
                     "how often the status line is shown; 0: every 0.5 s on a terminal, else every 10 s")
        ->check(CLI::Range(0.0, 1e7));
    add_example(*command, "build/millpond live config/live.yaml --stop-after-s 10");
    command->callback([options] { run_live(*options); });
}

} // namespace millpond
