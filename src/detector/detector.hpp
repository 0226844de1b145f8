// The detector: band-pass, envelope, floor, threshold, vote and veto over all channels, frame by frame; or, with method
// evidence, the same floor and threshold over the weighted envelopes of several bands and mixes of channels.
// Decisions depend on the samples alone: not on block size, processor, vector width or optimisation level.
#pragma once

#include "base/channels.hpp"
#include "base/event.hpp"
#include "base/frames.hpp"
#include "detector/bandpass_design.hpp"
#include "detector/detector_settings.hpp"

#include <memory>
#include <optional>
#include <string>
#include <vector>

namespace millpond {

/// One crossing of the threshold by the vote.
struct Crossing {
    SampleIndex at; ///< decision sample
    DetectionDetail detail;
    bool settling;  ///< filters are still settling after a gap or the start
    bool unsettled; ///< the floor has not seen enough clean signal
    bool vetoed;    ///< a reference channel was above its threshold within the veto window, or the signal jumped
};

/// A channel that was left out of the evidence's mixes, or taken in again.
struct SiteChange {
    std::uint16_t channel; ///< in the stream
    SiteState state;
};

/// One channel's floor, to carry from one session into the next. uV.
struct FloorState {
    double mean = 0.0;
    double deviation = 0.0;
    std::uint64_t frames = 0; ///< frames taken into the statistics
};

/// A deviation is the running mean distance from the mean, scaled so that a Gaussian law's is its SD.
inline constexpr double deviation_per_spread = 1.2533141373155003;

/// Vector width of the kernel; all give the same bits.
enum class KernelWidth : std::uint8_t {
    automatic,
    sse2,
    avx2,
    avx512
};

/// Refuses settings that contradict each other or the channels; what depends on the rate, make refuses.
void check_detector(const DetectorSettings& settings, const Channels& channels, const std::string& where = "detector");

class Detector {
  public:
    /// Thread: control. Allocates all it will ever need. Refuses settings that contradict each other or the rate.
    static Detector make(const DetectorSettings& settings, const Channels& channels, Hertz rate,
                         KernelWidth width = KernelWidth::automatic, const std::string& where = "detector");
    Detector(Detector&&) noexcept;
    Detector& operator=(Detector&&) noexcept;
    ~Detector();

    /// Runs over the block from its start and stops after the first crossing, or where a site died or came back or the
    /// state's gate moved, so that each is told at its place.
    /// Returns the frames consumed; the crossing, if any, is that of the last frame consumed.
    /// A block that does not begin where the last one ended must be announced by `gap` first.
    /// Thread: loop. Fixed work a frame; allocates, locks and throws nothing.
    std::size_t run(const FrameBlock& block, std::optional<Crossing>& crossing) noexcept;

    /// Frames from the block's start that have no non-finite value on a looked-at channel. Thread: loop.
    [[nodiscard]] std::size_t finite_frames(const FrameBlock& block) const noexcept;

    /// Frames are missing: filters start anew and settle, the floor keeps what it knows. Thread: loop.
    void gap(SampleIndex resumes_at) noexcept;

    /// Holds all state from `from` for the blanking time: a pulse goes out there. Thread: loop.
    void blank(SampleIndex from) noexcept;

    /// Frames since the detector last fell below its re-arm level after a crossing, as far as it looked; 0 while a
    /// crossing goes on, UINT64_MAX before the first. Thread: loop.
    [[nodiscard]] std::uint64_t quiet_frames() const noexcept;

    /// As new. Thread: loop.
    void reset() noexcept;

    /// The next channel, in stream order, that died or came back since the last call. Thread: loop.
    std::optional<SiteChange> site_change() noexcept;

    /// Whether the gate that follows the animal's state opened (true) or closed since the last call. Thread: loop.
    std::optional<bool> state_gate_change() noexcept;
    /// There is such a gate. It is open until it has seen enough.
    [[nodiscard]] bool has_state_gate() const noexcept;
    [[nodiscard]] bool state_gate_open() const noexcept;

    /// The floor keeps a memory for time with all gates open and one for the rest, so that running does not spoil the
    /// floor of rest. One that has not settled yet begins as a copy of the other, and adapts as fast as one
    /// that has just settled. Thread: loop.
    void use_memory(bool gates_open) noexcept;

    /// Frames from here to where the gate or the watch over sites may next change something. Thread: loop.
    [[nodiscard]] std::uint64_t frames_to_verdict() const noexcept;

    /// Starts from floors of an earlier session, one for each ripple and reference channel in stream order, then, with
    /// rule mean, that of the mean; with method evidence just that of the evidence. Thread: control, before the first
    /// block.
    void warm_start(const std::vector<FloorState>& floors);

    /// Number of floors: ripple and reference channels, and one more with rule mean; one with method evidence.
    [[nodiscard]] std::size_t floor_count() const noexcept;
    /// The floor `i` as an event detail. Thread: loop.
    [[nodiscard]] FloorDetail floor(std::size_t i) const noexcept;

    /// The floor has seen enough clean signal.
    [[nodiscard]] bool settled() const noexcept;
    /// The filters are still settling after a gap or the start.
    [[nodiscard]] bool settling() const noexcept;
    /// Frames that filters and smoother need after a gap before a crossing counts.
    [[nodiscard]] std::uint64_t filter_settle_frames() const noexcept;
    /// Group delay of the band-pass at the band's centre, in samples; with method evidence of its heaviest feature.
    [[nodiscard]] double filter_delay_samples() const noexcept;
    /// The same and the smoother's delay.
    [[nodiscard]] double delay_samples() const noexcept;
    [[nodiscard]] const BandpassDesign& bandpass() const noexcept;
    /// Threshold in deviations above the floor.
    [[nodiscard]] double threshold_deviations() const noexcept;
    /// The vector width in use.
    [[nodiscard]] KernelWidth width() const noexcept;

    /// The dear half of `run` alone, for sweeps over thresholds: envelopes of all frames of a block, envelope_stride()
    /// values a frame, that of floor `i` at floor_column(i). No floor, no threshold, no
    /// blanking; the same bits that `run` compares where nothing blanked it. Gaps are announced as for `run`. A
    /// detector does one or the other. Thread: one, cold.
    /// `jumped`, where given, gets 1 for a frame at which a crossing would be vetoed by a sudden step (evidence only).
    void envelopes(const FrameBlock& block, std::span<double> out, std::span<unsigned char> jumped = {}) noexcept;
    [[nodiscard]] std::size_t envelope_stride() const noexcept;
    /// Where the envelope of floor `i` stands among them.
    [[nodiscard]] std::size_t floor_column(std::size_t i) const noexcept;
    /// Features of the evidence that have something to look at; the first ones of that stride. 0 with method envelope.
    [[nodiscard]] std::size_t feature_count() const noexcept;

    /// Watches every frame's envelopes, for pictures and tests; slow, never in a live session. Empty: nobody watches.
    /// Called with the frame's place and one envelope for each looked-at channel or feature, then the sum's, if any
    /// (uV).
    using Watcher = void (*)(void* context, SampleIndex at, std::span<const double> envelopes);
    void watch(Watcher watcher, void* context) noexcept;

  private:
    struct State;
    explicit Detector(std::unique_ptr<State> state) noexcept;
    std::unique_ptr<State> state_;
};

} // namespace millpond
