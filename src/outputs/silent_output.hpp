// An output without a line: orders are journaled and go nowhere, so that the whole arrow runs on any computer.
#pragma once

#include "outputs/output.hpp"

namespace millpond {

class SilentOutput : public Output {
  public:
    bool set_line(bool /*high*/) noexcept override { return true; }
};

} // namespace millpond
