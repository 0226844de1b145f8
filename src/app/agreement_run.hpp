// Every rule of the referee over one recording, beside each other and beside a person's labels. Thread: cold.
#pragma once

#include "base/channels.hpp"
#include "base/frames.hpp"
#include "referee/agreement.hpp"
#include "referee/referee.hpp"

#include <optional>
#include <string>
#include <vector>

namespace millpond {

/// Takes the recording once, in blocks, for all rules. Memory: that of so many referees, 8 bytes a frame each.
class AgreementRun {
  public:
    /// All rules by name, each with the artefact settings of `referee`; and `referee` itself, as `name`, where it is
    /// none of them. Refuses what Referee::make refuses.
    AgreementRun(const RefereeSettings& referee, const std::string& name, const Channels& channels, Hertz rate);

    void add(const FrameBlock& block);
    /// Once. `labels` come first in the tables, where there are some.
    [[nodiscard]] Agreement finish(std::optional<RippleList> labels);

  private:
    struct Named {
        std::string name;
        Referee referee;
    };
    std::vector<Named> rules_;
    Hertz rate_;
};

} // namespace millpond
