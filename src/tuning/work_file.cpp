#include "tuning/work_file.hpp"

#include "base/refusal.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <charconv>
#include <fstream>
#include <iterator>
#include <regex>
#include <sstream>

namespace millpond {
namespace {

constexpr const char* title = "millpond tune work 1";
constexpr std::size_t head_lines = 7;

std::array<std::string, head_lines> head_of(const WorkIdentity& identity, SweepPart part) {
    return {title,
            "program\t" + identity.program,
            "recordings\t" + identity.recordings,
            "truth\t" + identity.truth,
            "settings\t" + identity.settings,
            fmt::format("candidates\t{}", identity.candidates),
            fmt::format("part\t{}/{}", part.number, part.of)};
}

// One list of a result's numbers for writing and reading.
template <class Part, class Visit> void each_number(Part& part, Visit visit) {
    visit(part.hits);
    visit(part.ripples);
    visit(part.repeats);
    visit(part.false_detections);
    visit(part.before_half);
    visit(part.halves_known);
    visit(part.eligible_frames);
    visit(part.eligible_minutes);
    visit(part.false_per_minute);
    visit(part.latency_median_ms);
    visit(part.latency_p90_ms);
}

std::string line_of(SweepStage stage, std::size_t place, const SweepResult& result) {
    auto line = fmt::format("{}\t{}\t{}", stage == SweepStage::swept ? "swept" : "confirmed", place, result.delay_ms);
    const auto add = [&](const auto& number) { line += fmt::format("\t{}", number); };
    each_number(result.training, add);
    each_number(result.held_out, add);
    return line + "\n";
}

class Fields {
  public:
    explicit Fields(const std::string& line) : words_(line) {}

    template <class Number> void take(Number& number) {
        std::string word;
        std::getline(words_, word, '\t');
        const auto read = std::from_chars(word.data(), word.data() + word.size(), number);
        good_ = good_ && read.ec == std::errc{} && read.ptr == word.data() + word.size();
    }
    std::string word() {
        std::string word;
        std::getline(words_, word, '\t');
        return word;
    }
    [[nodiscard]] bool good() const noexcept { return good_ && words_.eof(); }

  private:
    std::istringstream words_;
    bool good_ = true;
};

// Lines that end; what was cut off at the end is no line.
std::vector<std::string> whole_lines(const std::filesystem::path& file) {
    std::ifstream in(file, std::ios::binary);
    if (!in) {
        throw Refusal(file.string(), "no file that can be read", "a work file of tune");
    }
    const std::string text{std::istreambuf_iterator<char>(in), {}};
    std::vector<std::string> lines;
    for (std::size_t from = 0, to = 0; (to = text.find('\n', from)) != std::string::npos; from = to + 1) {
        lines.push_back(text.substr(from, to - from));
    }
    return lines;
}

std::string joined(const std::vector<std::string>& lines) {
    std::string text;
    for (const auto& line : lines) {
        text += line + "\n";
    }
    return text;
}

void check_head(const std::filesystem::path& file, const std::vector<std::string>& lines, const WorkIdentity& identity,
                SweepPart part) {
    const auto expected = head_of(identity, part);
    if (lines.empty() || lines.front() != title) {
        throw Refusal(file.string(), "no work file of tune", fmt::format("a file that begins with '{}'", title));
    }
    for (std::size_t i = 0; i < expected.size(); ++i) {
        if (i >= lines.size() || lines[i] != expected[i]) {
            const auto what = expected[i].substr(0, expected[i].find('\t'));
            throw Refusal(fmt::format("{}:{}", file.string(), i + 1),
                          fmt::format("work of another {}", what == "recordings" ? "set of recordings"
                                                            : what == "truth"    ? "set of ripples"
                                                            : what == "settings" ? "grid or plan"
                                                            : what == "program"  ? "version of the program"
                                                            : what == "part"     ? "part"
                                                                                 : "number of settings"),
                          "the same recordings, labels and options as when it was begun, or a new start with "
                          "--overwrite");
        }
    }
}

std::vector<SweepPart> parts_beside(const std::filesystem::path& out) {
    const auto folder = out.has_parent_path() ? out.parent_path() : std::filesystem::path(".");
    const std::regex ending("([1-9][0-9]{0,5})-of-([1-9][0-9]{0,5})");
    const auto stem = out.filename().string() + ".part-";
    std::vector<SweepPart> parts;
    for (const auto& entry : std::filesystem::directory_iterator(folder)) {
        const auto name = entry.path().filename().string();
        const auto rest = name.starts_with(stem) ? name.substr(stem.size()) : std::string{};
        if (std::smatch match; std::regex_match(rest, match, ending)) {
            parts.push_back({std::stoul(match[1]), std::stoul(match[2])});
        }
    }
    if (parts.empty()) {
        throw Refusal("--merge", "no part beside " + out.string(),
                      out.string() + ".part-K-of-N, as --part writes them");
    }
    std::sort(parts.begin(), parts.end(), [](const SweepPart& a, const SweepPart& b) { return a.number < b.number; });
    return parts;
}

// All of one division and in order, without one missing.
void check_all_there(const std::vector<SweepPart>& parts, const std::filesystem::path& out) {
    for (std::size_t i = 0; i < parts.front().of; ++i) {
        if (i >= parts.size() || parts[i].number != i + 1) {
            throw Refusal("--merge", fmt::format("no part {} of {}", i + 1, parts.front().of),
                          work_path(out, {i + 1, parts.front().of}).string());
        }
    }
}

} // namespace

WorkFile::WorkFile(std::filesystem::path file, std::size_t candidates)
    : file_(std::move(file)), swept_(candidates), confirmed_(candidates) {}

WorkFile WorkFile::begin(const std::filesystem::path& file, const WorkIdentity& identity, SweepPart part) {
    WorkFile work(file, identity.candidates);
    const auto head = head_of(identity, part);
    work.write(joined({head.begin(), head.end()}), true);
    return work;
}

WorkFile WorkFile::read(const std::filesystem::path& file, const WorkIdentity& identity, SweepPart part) {
    WorkFile work(file, identity.candidates);
    const auto lines = whole_lines(file);
    check_head(file, lines, identity, part);
    for (std::size_t i = head_lines; i < lines.size(); ++i) {
        work.take_line(lines[i]);
    }
    return work;
}

WorkFile WorkFile::resume(const std::filesystem::path& file, const WorkIdentity& identity, SweepPart part) {
    auto work = read(file, identity, part);
    work.write(joined(whole_lines(file)), true); // without a line that was cut
    return work;
}

void WorkFile::take_line(const std::string& line) {
    Fields fields(line);
    const auto stage = fields.word();
    std::size_t place = 0;
    SweepResult result;
    const auto take = [&](auto& number) { fields.take(number); };
    fields.take(place);
    fields.take(result.delay_ms);
    each_number(result.training, take);
    each_number(result.held_out, take);
    if (!fields.good() || place >= swept_.size() || (stage != "swept" && stage != "confirmed")) {
        throw Refusal(file_.string(), "a damaged line '" + line.substr(0, 40) + "'",
                      "lines as tune wrote them; --overwrite begins anew");
    }
    (stage == "swept" ? swept_ : confirmed_)[place] = result;
}

void WorkFile::keep(SweepStage stage, std::size_t place, const SweepResult& result) {
    write(line_of(stage, place, result), false);
    (stage == SweepStage::swept ? swept_ : confirmed_)[place] = result;
}

void WorkFile::write(const std::string& text, bool anew) {
    // A fresh start stands under another name until it is whole; results are added line by line.
    auto target = file_;
    if (anew) {
        target += ".new";
    }
    std::ofstream out(target, std::ios::binary | (anew ? std::ios::trunc : std::ios::app));
    out << text;
    out.close();
    if (!out) {
        throw Refusal(file_.string(), "no way to write it", "a place with room and the right to write");
    }
    if (anew) {
        std::filesystem::rename(target, file_);
    }
}

std::filesystem::path work_path(const std::filesystem::path& out) {
    return out.string() + ".work";
}

std::filesystem::path work_path(const std::filesystem::path& out, SweepPart part) {
    return fmt::format("{}.part-{}-of-{}", out.string(), part.number, part.of);
}

SweepResults merge_parts(const std::filesystem::path& out, const WorkIdentity& identity) {
    const auto found = parts_beside(out);
    SweepResults all(identity.candidates);
    for (const std::size_t of = found.begin()->of; const auto& part : found) {
        if (part.of != of) {
            throw Refusal("--merge", fmt::format("parts of {} and of {}", of, part.of), "parts of one division");
        }
        const auto file = work_path(out, part);
        const auto results = WorkFile::read(file, identity, part).swept();
        for (auto i = part.first(identity.candidates); i < part.last(identity.candidates); ++i) {
            if (!results[i]) {
                throw Refusal(file.string(), "a part that is not finished", "the same --part once more with --resume");
            }
            all[i] = results[i];
        }
    }
    check_all_there(found, out);
    return all;
}

} // namespace millpond
