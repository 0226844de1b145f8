// What happened, as one fixed-size value: the language in which the loop tells the journal, the dry run and the audit.
// Thread: made in the loop (and in pulse and control for their own kinds); plain bytes, so it may cross any ring.
#pragma once

#include "base/units.hpp"

#include <array>
#include <cstdint>
#include <string_view>
#include <type_traits>

namespace millpond {

/// Values are part of the session format: never renumber, only add.
enum class EventKind : std::uint8_t {
    session_start = 1, ///< first event of a session
    session_end = 2,   ///< last event of a session that was closed; where it is absent the session was cut
    detection = 3,     ///< the detector crossed; a trigger or a withheld follows at the same sample
    trigger = 4,       ///< the arbiter let a detection through; what becomes of it, the condition says
    withheld = 5,      ///< the arbiter refused it; `code` is the Rule
    pulse = 6,         ///< the order was written to the output
    pulse_end = 7,     ///< the line was ordered low again
    gap = 8,           ///< frames are missing from here; `code` is the GapCause
    floor = 9,         ///< one site's floor, once a second
    latency_bins = 10, ///< counts to add to one latency histogram; `code` is the LatencyPart
    note = 11,         ///< up to 38 characters of an operator's mark; longer marks continue in the next event
    state = 12,        ///< the arbiter's state changed; `code` is the new ArmState
    gate = 13,         ///< a gate opened or closed
    packet_count = 14, ///< packets counted by cause since the last such event; `code` is the PacketCause
    dropped = 15,      ///< events or frames that the journal had to drop because its ring was full
    site = 16,         ///< a channel was left out of the evidence's mixes, or taken in again; `code` is the SiteState
    epoch = 17,        ///< an epoch of the session's plan begins
    trial = 18,        ///< a session, block or trial of the assignment begins
    order = 19,  ///< a pulse was ordered: at a trigger, or at a slot; the one kind here that tells of the condition
    speed = 20,  ///< the speed that moved the speed gate, or that it had grown stale at
    device = 21, ///< an output stands ready, was lost or is back; `code` is the DeviceState
    slot = 22,   ///< a moment for a delayed or scheduled pulse; blanked in every condition, whether one is given or not
    omitted = 23, ///< such a moment, at which no condition may give a pulse; `code` is the Rule
};

/// Why a detection was refused: exactly one rule each, the first that applies in this order. The detector's own reasons
/// come first, so that a detector can be scored whatever was allowed. Values are part of the session format.
enum class Rule : std::uint8_t {
    none = 0,           ///< not refused
    gap = 1,            ///< filters are settling after the start or missing frames: look at packets lost
    unsettled = 2,      ///< the floor has not seen enough clean signal yet: wait
    veto = 3,           ///< the reference rose too, or the signal jumped: most likely not a ripple
    faulted = 4,        ///< an output, the journal or the stream failed: mend it, then arm again
    not_armed = 5,      ///< pulses are not allowed: arm when the protocol says so
    gate = 6,           ///< a gate is closed, or the plan's epoch allows no pulses
    held = 7,           ///< a moment for a pulse was held off by ripples for as long as it may be
    lock_out = 8,       ///< too soon after the trigger before it
    second_limit = 9,   ///< as many pulses as allowed in one second
    session_limit = 10, ///< as many pulses as allowed in one session: end it
    minute_limit = 11,  ///< as many pulses as allowed in one minute
    epoch_limit = 12,   ///< as many pulses as allowed in one epoch of the plan
    interval = 13,      ///< nearer to the pulse before it than allowed
};
inline constexpr std::size_t rule_count = 14;

enum class GapCause : std::uint8_t {
    packet_loss = 1,    ///< packets never arrived, or too late: check the network and the sender
    non_finite = 2,     ///< the source delivered not-a-number or infinity
    source_restart = 3, ///< the sender began anew; the length is estimated from this computer's clock
};

/// Values are part of the session format.
enum class ArmState : std::uint8_t {
    not_armed = 0, ///< detects, never pulses
    armed = 1,     ///< pulses are allowed
    faulted = 2,   ///< something failed; pulses are refused until it is mended and armed anew
};

/// A channel as the evidence detector sees it. Values are part of the session format.
enum class SiteState : std::uint8_t {
    alive = 0,
    flat = 1, ///< did not move for a second: broken wire, or at the end of the converter's range
    huge = 2, ///< moved far more than it used to, while the others did not: loose contact
};

/// What moved the state. Values are part of the session format.
enum class StateCause : std::uint8_t {
    start = 0,              ///< as the settings say
    command = 1,            ///< a command by OSC
    stale_stream = 2,       ///< no packet for longer than stream.stale_after_ms
    output_failed = 3,      ///< the output refused an order
    journal_failed = 4,     ///< disk full, or the journal could not keep up
    session_end = 5,        ///< the session is ending
    emergency_stop = 6,     ///< somebody stopped it: /clear when all is safe, then arm
    runaway = 7,            ///< far more triggers than expected, or each one a fixed time after the one before: look at
                            ///< artefacts and threshold, then arm
    too_many_gaps = 8,      ///< too many gaps or lost frames within a minute: mend the stream, then arm
    floor_out_of_range = 9, ///< a floor left its range: look at electrodes and amplifier, then arm
    line_held = 10,         ///< a line was high for longer than its longest_high_ms, and was lowered by the watchdog
    watchdog_lost = 11,     ///< the process that lowers the lines when this one cannot was gone or stood still
};

/// Who moved a gate, the state or the plan. Values are part of the session format.
enum class ChangeSource : std::uint8_t {
    unknown = 0,   ///< written before sources were kept
    settings = 1,  ///< as the settings say
    command = 2,   ///< a command by OSC; its sender's address stands beside
    signal = 3,    ///< a signal of the operating system to the program
    lfp_state = 4, ///< the animal's state, by the signal itself
    speed = 5,     ///< the animal's speed
    plan = 6,      ///< the session's plan
    program = 7,   ///< the program itself: a limit, a fault, the session's end
};

/// A source and, for a command, its sender.
struct ChangedBy {
    ChangeSource source = ChangeSource::unknown;
    std::uint16_t port = 0;    ///< UDP port of the sender
    std::uint32_t address = 0; ///< IPv4 address of the sender, the first number highest
};

/// An output as the control thread sees it. Values are part of the session format.
enum class DeviceState : std::uint8_t {
    ready = 0, ///< at the start
    lost = 1,  ///< it no longer answers: look at cable and power; it is tried again every second
    back = 2,  ///< it takes orders again, and its line was ordered low; arming is the operator's
};

/// Parts of the closed loop, each with its own histogram. Values are part of the session format.
enum class LatencyPart : std::uint8_t {
    packing = 0,   ///< decision sample to the last sample of its packet
    transport = 1, ///< packet sent to packet arrived; only where the sender stamps its packets
    wake = 2,      ///< packet arrived to loop begins on it
    compute = 3,   ///< loop begins to decision made
    output = 4,    ///< decision made to write returned
    loop = 5,      ///< packet arrived to loop done with it, every packet
    pulse_end = 6, ///< how late the end of a pulse was ordered
};
inline constexpr std::size_t latency_part_count = 7;

/// Packets by what became of them. Values are part of the session format.
enum class PacketCause : std::uint8_t {
    accepted = 0,
    truncated = 1,          ///< shorter than its header says
    wrong_version = 2,      ///< RTP version is not 2
    wrong_payload_type = 3, ///< not the payload type of the settings or the SDP file
    wrong_source = 4,       ///< another SSRC while the known one is alive
    wrong_length = 5,       ///< payload is not a whole number of frames
    oversized = 6,          ///< more than the receive buffer holds
    repeated = 7,           ///< its frames had been taken already
    late = 8,               ///< its frames had been given up as a gap
    reordered = 9,          ///< arrived out of order and was put right
    lost = 10,              ///< never seen, by the sequence numbers
    restarted = 11,         ///< first packet of a sender that began anew
};
inline constexpr std::size_t packet_cause_count = 12;

struct DetectionDetail {
    float envelope;  ///< uV (evidence: weighted uV), of the deciding site (the largest above its floor) or of the mean
                     ///< over sites
    float floor;     ///< uV
    float deviation; ///< uV
    float threshold; ///< uV
    std::uint16_t votes; ///< ripple sites above their thresholds
    std::uint16_t site;  ///< channel in the stream, 65535 for the mean over sites and for evidence
};

/// Why there is a moment for a pulse. Values are part of the session format.
enum class PulseOrigin : std::uint32_t {
    trigger = 0,  ///< at once after a detection
    schedule = 1, ///< a place of a control schedule
    delay = 2,    ///< a while after a trigger
};

/// Of triggers, withheld, slots, omitted and orders.
struct TriggerDetail {
    std::uint64_t from;   ///< decision sample of the trigger; the planned place of a schedule
    std::uint32_t number; ///< of the session's trigger, from 1 (0: withheld); of the place in the schedule, from 1
    PulseOrigin origin;
    std::uint32_t caught;    ///< 1 where the trigger is a catch trial, drawn in every condition
    std::uint32_t condition; ///< of an order: the condition that gave it; else 0
};

/// Parts in ns; a part that was not measured is `not_measured`, never 0.
struct PulseDetail {
    static constexpr std::int64_t not_measured = INT64_MIN;
    std::int64_t packing_ns, transport_ns, wake_ns, compute_ns, output_ns;
};

struct PulseEndDetail {
    std::int64_t width_ns;    ///< order to rise until order to fall, by this computer's clock
    std::int64_t late_ns;     ///< order to fall after the time planned for it
    std::uint16_t output = 0; ///< its place in settings, from 0
    std::uint16_t marker = 0; ///< 1 where the output follows triggers, not pulses
};

struct GapDetail {
    std::uint64_t frames;
};

struct FloorDetail {
    double mean, deviation;         ///< uV
    float threshold;                ///< uV
    std::uint16_t site;             ///< channel in the stream, 65535 for the mean over sites and for evidence
    std::uint16_t settled;          ///< 1 once enough clean signal was seen
    std::uint64_t frames;           ///< frames the statistics have taken
    std::uint64_t gates_closed = 0; ///< 1 where it is the memory of time with a gate closed
};

struct LatencyBins {
    struct Bin {
        std::uint32_t bin, count; ///< bin of base/histogram.hpp; count 0 ends the list
    };
    std::array<Bin, 5> bins;
};

struct NoteDetail {
    std::uint8_t length;    ///< characters used
    std::uint8_t continues; ///< 1 where the next note event goes on with this text
    std::array<char, 38> text;
};

// The three that follow have no padding: audits compare them byte by byte. Source, port and address are a ChangedBy.
struct StateDetail {
    std::uint8_t before;     ///< ArmState
    std::uint8_t cause;      ///< StateCause
    std::uint8_t source = 0; ///< ChangeSource
    std::uint8_t unused = 0;
    std::uint16_t port = 0, unused_too = 0;
    std::uint32_t address = 0;
};

struct GateDetail {
    std::uint8_t open;
    std::array<char, 32> name; ///< zero-terminated
    std::uint8_t source = 0;   ///< ChangeSource
    std::uint16_t port = 0;
    std::uint32_t address = 0;
};

struct EpochDetail {
    std::uint64_t frames;  ///< planned length; 0: until told to go on
    std::uint32_t address; ///< of whoever told it
    std::uint16_t port;
    std::uint16_t index;       ///< in the plan, from 0; as many as the plan has: after its last one
    std::uint8_t source;       ///< ChangeSource
    std::uint8_t pulses;       ///< 1 where pulses are allowed
    std::array<char, 22> name; ///< zero-terminated
};

/// Fills, and reads, the three of a detail.
template <class Detail> void set_by(Detail& detail, const ChangedBy& by) noexcept {
    detail.source = static_cast<std::uint8_t>(by.source);
    detail.port = by.port;
    detail.address = by.address;
}
template <class Detail> [[nodiscard]] ChangedBy by_of(const Detail& detail) noexcept {
    return {static_cast<ChangeSource>(detail.source), detail.port, detail.address};
}

struct SpeedDetail {
    double value;         ///< in the unit of the settings
    std::int64_t age_ns;  ///< since it came
    std::uint64_t values; ///< received since the event before
};

struct TrialDetail {
    std::uint32_t number; ///< from 1
    std::uint32_t listed; ///< 1 where the assignment's list has it; 0 beyond its end: no pulses
};

struct SiteDetail {
    std::uint16_t channel; ///< in the stream
};

struct DeviceDetail {
    std::uint16_t output;      ///< its place in settings, from 0
    std::uint16_t marker;      ///< 1 where the output follows triggers, not pulses
    std::array<char, 32> name; ///< zero-terminated
};

struct CountDetail {
    std::uint64_t count;
};

/// Trivially copyable, 64 bytes, no padding left unset by the factories below.
struct Event {
    EventKind kind{};
    std::uint8_t code = 0; ///< Rule, GapCause, ArmState, SiteState, DeviceState, LatencyPart or PacketCause, by kind
    std::uint16_t reserved = 0;
    std::uint32_t sequence = 0; ///< set by the journal: counts the session's events from 0
    SampleIndex sample;         ///< where in the stream
    std::int64_t time_ns = 0;   ///< UTC since 1970, by this computer; 0 in a dry run
    std::array<std::uint8_t, 40> detail{};

    template <class Detail>
    static Event make(EventKind kind, std::uint8_t code, SampleIndex at, const Detail& what) noexcept {
        static_assert(std::is_trivially_copyable_v<Detail> && sizeof(Detail) <= sizeof(detail));
        Event event;
        event.kind = kind;
        event.code = code;
        event.sample = at;
        __builtin_memcpy(event.detail.data(), &what, sizeof(Detail));
        return event;
    }

    template <class Detail> [[nodiscard]] Detail as() const noexcept {
        static_assert(std::is_trivially_copyable_v<Detail> && sizeof(Detail) <= sizeof(detail));
        Detail what;
        __builtin_memcpy(&what, detail.data(), sizeof(Detail));
        return what;
    }

    bool operator==(const Event&) const = default;
};
static_assert(std::is_trivially_copyable_v<Event> && sizeof(Event) == 64);

/// Takes events one by one, in order.  Thread: that of whoever runs the engine.  Blocks, allocates, throws: never in
/// the loop.
class EventSink {
  public:
    virtual ~EventSink() = default;
    virtual void take(const Event& event) noexcept = 0;
};

/// Whether events of that kind tell what a trigger became of: the only ones that differ between conditions.
[[nodiscard]] constexpr bool tells_of_condition(EventKind kind) noexcept {
    return kind == EventKind::order || kind == EventKind::pulse || kind == EventKind::pulse_end;
}

// One word for one thing: what every table, report and log line calls them.
[[nodiscard]] std::string_view name_of(EventKind kind) noexcept;
[[nodiscard]] std::string_view name_of(Rule rule) noexcept;
[[nodiscard]] std::string_view name_of(PulseOrigin origin) noexcept;
[[nodiscard]] std::string_view name_of(GapCause cause) noexcept;
[[nodiscard]] std::string_view name_of(ArmState state) noexcept;
[[nodiscard]] std::string_view name_of(SiteState state) noexcept;
[[nodiscard]] std::string_view name_of(StateCause cause) noexcept;
[[nodiscard]] std::string_view name_of(ChangeSource source) noexcept;
[[nodiscard]] std::string_view name_of(DeviceState state) noexcept;
[[nodiscard]] std::string_view name_of(LatencyPart part) noexcept;
[[nodiscard]] std::string_view name_of(PacketCause cause) noexcept;

} // namespace millpond
