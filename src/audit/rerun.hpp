// The engine once more over a session's stored samples: does it decide the same?
// Thread: cold.
//
// Samples come from the session's sample file; commands, failures and gaps come from its journal, each applied at the
// place where it was journaled. A control schedule's places are those that the journal says were due. All else the
// engine has to find by itself: detections, triggers, withheld, gaps of non-finite samples, floors, starting state and
// gates.
#pragma once

#include "assignment/unblinding.hpp"
#include "base/channels.hpp"
#include "engine/engine.hpp"
#include "journal/session_reader.hpp"

#include <functional>
#include <optional>
#include <string>
#include <vector>

namespace millpond {

/// One event that is not the same in both; `what` says it in words.
struct Difference {
    SampleIndex at;
    std::optional<Event> journaled; ///< empty: only the re-run has it
    std::optional<Event> again;     ///< empty: only the journal has it
    std::string what;
};

struct Rerun {
    bool done = false;
    std::string why_not;         ///< where it was not done
    SampleIndex from, upto;      ///< events in [from, upto) were compared
    std::string upto_why;        ///< what ended the comparison
    std::uint64_t compared = 0;  ///< journaled events that were looked at
    std::uint64_t decisions = 0; ///< of them detections, triggers, withheld, slots, omitted and orders
    std::vector<Difference> differences;

    [[nodiscard]] bool reproduced() const noexcept { return done && differences.empty(); }
};

/// Told the share that is done, 0 to 1, now and then.
using ShareDone = std::function<void(double share)>;

/// `where` names the settings for messages. Refuses settings that the session's stream cannot have. Of a session whose
/// assignment is sealed all is compared but the orders: they alone depend on its condition.
[[nodiscard]] Rerun rerun_session(const SessionReader& session, const EngineSettings& settings,
                                  const std::string& where, const ShareDone& progress = {},
                                  const std::optional<SessionAssignment>& assignment = {});

/// Compares two lists of events, each ascending by sample; time stamps and sequence numbers do not count.
[[nodiscard]] std::vector<Difference> compare_events(const std::vector<Event>& journaled,
                                                     const std::vector<Event>& again);

/// One event in words: `withheld at 1234 (lock-out)`.
[[nodiscard]] std::string told(const Event& event);

} // namespace millpond
