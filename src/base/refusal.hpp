// The one exception for bad input: settings, files, labels, command lines. Thread: cold and control, never the loop.
#pragma once

#include <exception>
#include <string>
#include <string_view>
#include <vector>

namespace millpond {

/// Says in one line where the trouble is, what was found there, and what is allowed.
/// Caught once, in the command, which prints what() and ends with status 2.
class Refusal : public std::exception {
  public:
    /// `where` names the file and the place in it: `rig.yaml:12: detector.filter.low_hz`.
    Refusal(std::string_view where, std::string_view found, std::string_view allowed);

    [[nodiscard]] const char* what() const noexcept override { return line_.c_str(); }

  private:
    std::string line_;
};

/// The member of `known` nearest to `found` by edit distance, or empty where none is near enough to be a slip.
[[nodiscard]] std::string nearest_name(std::string_view found, const std::vector<std::string>& known);

} // namespace millpond
