#include "tuning/shared_pass.hpp"

#include "base/event.hpp"
#include "tuning/envelope_pass.hpp"
#include "tuning/floor_bank.hpp"

#include <algorithm>
#include <memory>

namespace millpond {
namespace {

// Frames that are worked on at a time: their statistics stay in the processor's cache.
constexpr std::size_t frames_at_a_time = 1024;

// The pair of pass and rule for the settings' method; both methods have the same, one with other statistics.
struct Kind {
    std::unique_ptr<StatisticPass> pass;
    std::unique_ptr<CrossingRule> rule;
};

Kind kind_for(std::span<const DetectorSettings> settings, const Channels& channels, Hertz rate) {
    Kind kind;
    auto pass = std::make_unique<EnvelopePass>(settings.front(), channels, rate);
    for (const auto& each : settings.subspan(1)) {
        check_detector(each, channels);
    }
    kind.rule = std::make_unique<FloorBank>(settings, channels, rate, *pass);
    kind.pass = std::move(pass);
    return kind;
}

// Walks the recording, splitting at missing frames as the engine does.
class Walk {
  public:
    Walk(Kind& kind, FrameBlock recording)
        : kind_(kind), recording_(recording), statistics_(frames_at_a_time * kind.pass->values()) {
        announce(SampleIndex{0});
    }

    [[nodiscard]] bool done() const noexcept { return at_ == recording_.frames(); }
    [[nodiscard]] std::uint64_t at() const noexcept { return at_; }
    [[nodiscard]] const Intervals& gaps() const noexcept { return gaps_; }

    void step() {
        const auto rest = recording_.part(at_, std::min(frames_at_a_time, recording_.frames() - at_));
        const std::size_t finite = kind_.pass->finite_frames(rest);
        if (finite == 0) {
            miss_one();
            return;
        }
        if (missing_) {
            announce(rest.first);
            missing_ = false;
        }
        const auto statistics = std::span(statistics_).first(finite * kind_.pass->values());
        kind_.pass->run(rest.part(0, finite), statistics);
        kind_.rule->take(rest.first, statistics, kind_.pass->values());
        at_ += finite;
    }

  private:
    void announce(SampleIndex resumes_at) noexcept {
        kind_.pass->gap(resumes_at);
        kind_.rule->gap(resumes_at);
    }
    void miss_one() {
        if (!missing_) {
            gaps_.push_back({SampleIndex{at_}, SampleIndex{at_}});
            missing_ = true;
        }
        ++at_;
        gaps_.back().to = SampleIndex{at_};
    }

    Kind& kind_;
    FrameBlock recording_;
    std::vector<double> statistics_;
    Intervals gaps_;
    std::size_t at_ = 0;
    bool missing_ = false;
};

// The events that eligible time is built from, as an engine without pulses journals them.
Intervals eligible_of(const Detections& detections, const Walk& walk, std::uint64_t settle_frames, Hertz rate) {
    std::vector<Event> events;
    for (const auto& gap : walk.gaps()) {
        events.push_back(Event::make(EventKind::gap, 0, gap.from, GapDetail{gap.to - gap.from}));
    }
    if (detections.settled_from.value != UINT64_MAX) {
        FloorDetail settled{};
        settled.settled = 1;
        events.push_back(Event::make(EventKind::floor, 0, detections.settled_from, settled));
    }
    EligibleRules rules;
    rules.settle_frames = settle_frames;
    return eligible_time(events, rules, rate, SampleIndex{0}, SampleIndex{walk.at()});
}

} // namespace

bool share_a_pass(const DetectorSettings& a, const DetectorSettings& b) noexcept {
    return EnvelopePass::shared_by(a, b);
}

PassFindings run_shared_pass(std::span<const DetectorSettings> settings, const Channels& channels, Hertz rate,
                             std::span<const float> data, const std::atomic<bool>& stop,
                             std::atomic<std::uint64_t>& seen) {
    auto kind = kind_for(settings, channels, rate);
    Walk walk(kind, {SampleIndex{0}, channels.size(), data});
    PassFindings findings;
    while (!walk.done()) {
        if (stop.load(std::memory_order_relaxed)) { // a wish, nothing is published with it
            return findings;
        }
        const auto before = walk.at();
        walk.step();
        seen.fetch_add(walk.at() - before, std::memory_order_relaxed); // a count for the eye
    }
    findings.delay_samples = kind.pass->delay_samples();
    for (auto& each : kind.rule->detections()) {
        auto eligible = eligible_of(each, walk, kind.pass->settle_frames(), rate);
        findings.found.push_back({std::move(each.places), std::move(eligible)});
    }
    return findings;
}

} // namespace millpond
