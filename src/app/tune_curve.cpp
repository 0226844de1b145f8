// The trade-off as a picture of characters: hit rate upwards, false per minute to the right on a logarithmic axis.
#include "app/tune_tables.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>

namespace millpond {
namespace {

constexpr std::size_t columns = 61, rows = 13;
constexpr double least_rate = 0.1; // false per minute at the left edge; what is below stands there

class Picture {
  public:
    /// `most`: false per minute at the right edge; `lowest`: hit rate at the bottom.
    Picture(double most, double lowest)
        : decades_(std::max(1.0, std::ceil(std::log10(most / least_rate)))),
          lowest_(std::min(0.9, std::floor(lowest * 10.0) / 10.0)) {
        lines_.fill(std::string(columns, ' '));
    }

    void limit(double rate) {
        for (auto& line : lines_) {
            line[column(rate)] = ':';
        }
    }
    void mark(const PartFigures& part, char character) {
        const double share = part.hit_rate().share, rate = part.false_per_minute;
        if (!std::isfinite(rate) || !(share >= lowest_)) {
            return;
        }
        const auto row = static_cast<std::size_t>(std::lround((1.0 - share) / (1.0 - lowest_) * (rows - 1)));
        char& place = lines_[row][column(rate)];
        place = place == ' ' || place == ':' || place == character ? character : both;
    }
    [[nodiscard]] std::string text() const {
        std::string text;
        for (std::size_t row = 0; row < rows; ++row) {
            const double percent = 100.0 - 100.0 * (1.0 - lowest_) * static_cast<double>(row) / (rows - 1);
            const auto label = row % 3 == 0 ? fmt::format("{:>5.1f}", percent) : std::string(5, ' ');
            text += fmt::format("{} |{}\n", label, trimmed(lines_[row]));
        }
        return text + fmt::format("      +{}\n{}\n", std::string(columns, '-'), scale());
    }

    static constexpr char both = '#';

  private:
    [[nodiscard]] std::size_t column(double rate) const {
        const double share = std::log10(std::max(rate, least_rate) / least_rate) / decades_;
        return static_cast<std::size_t>(std::lround(std::min(share, 1.0) * (columns - 1)));
    }
    static std::string trimmed(std::string line) {
        line.erase(line.find_last_not_of(' ') + 1);
        return line;
    }
    [[nodiscard]] std::string scale() const {
        std::string line(columns + 14, ' ');
        double rate = least_rate;
        for (int decade = 0; decade <= static_cast<int>(decades_); ++decade, rate *= 10.0) {
            const auto label = decade == 0 ? fmt::format("<={}", rate) : fmt::format("{}", std::round(rate));
            line.replace(column(rate) + 7 - (decade == 0 ? 2 : 0), label.size(), label);
        }
        return trimmed(line);
    }

    double decades_, lowest_;
    std::array<std::string, rows> lines_;
};

} // namespace

std::string curve_picture(const TuneOutcome& outcome, double max_false_per_minute) {
    const double most = std::max(10.0, 10.0 * max_false_per_minute);
    std::vector<const SweepResult*> shown;
    double lowest = 1.0;
    for (const auto place : outcome.front) {
        const auto& result = outcome.swept[place];
        if (result.training.false_per_minute <= most) {
            shown.push_back(&result);
            lowest = std::min(lowest, result.training.hit_rate().share);
        }
    }
    if (shown.empty()) {
        return {};
    }
    Picture picture(most, lowest);
    picture.limit(max_false_per_minute);
    for (const auto* result : shown) {
        picture.mark(result->training, '*');
    }
    for (const auto* result : shown) {
        picture.mark(result->held_out, 'o');
    }
    return fmt::format(
        "hit rate % against false per minute, the front without pulses: * training, o held out, {} both, "
        ": the limit\n{}",
        Picture::both, picture.text());
}

} // namespace millpond
