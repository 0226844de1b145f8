#include "app/described_options.hpp"

#include "base/refusal.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>

namespace millpond {
namespace {

std::string option_name(std::string path) {
    std::replace(path.begin(), path.end(), '.', '-');
    std::replace(path.begin(), path.end(), '_', '-');
    return "--" + path;
}

[[noreturn]] void refuse(const std::string& path, const std::string& given, const std::string& allowed) {
    throw Refusal("command line: " + option_name(path), "'" + given + "'", allowed);
}

template <class Number> bool parse(const std::string& text, Number& value) {
    const auto* end = text.data() + text.size();
    const auto [stopped, error] = std::from_chars(text.data(), end, value);
    return error == std::errc{} && stopped == end;
}

} // namespace

void DescribedOptions::add(CLI::App& command, const std::string& path, bool flag, const std::string& help) {
    auto& given = given_[path];
    const auto name = option_name(path);
    given.option = flag ? command.add_flag(name + ",!--no-" + name.substr(2), given.value, help)
                        : command.add_option(name, given.value, help)->type_name("");
    if (const auto dot = path.find('.'); dot != std::string::npos) {
        given.option->group("Options: " + path.substr(0, dot));
    }
}

const std::string* DescribedOptions::find(const std::string& path) const {
    const auto found = given_.find(path);
    return found == given_.end() || found->second.option->count() == 0 ? nullptr : &found->second.value;
}

double DescribedOptions::number(const std::string& path, const std::string& given, Range range) {
    double value = 0.0;
    if (!parse(given, value) || !(value >= range.least && value <= range.most)) {
        refuse(path, given, fmt::format("a number from {} to {}", range.least, range.most));
    }
    return value;
}

std::int64_t DescribedOptions::whole(const std::string& path, const std::string& given, Range range) {
    std::int64_t value = 0;
    if (!parse(given, value) ||
        !(static_cast<double>(value) >= range.least && static_cast<double>(value) <= range.most)) {
        refuse(path, given, fmt::format("a whole number from {} to {}", range.least, range.most));
    }
    return value;
}

bool DescribedOptions::flag(const std::string& given) {
    return given == "true";
}

std::size_t DescribedOptions::choice(const std::string& path, const std::string& given,
                                     const std::vector<std::string>& words) {
    const auto found = std::find(words.begin(), words.end(), given);
    if (found == words.end()) {
        refuse(path, given, fmt::format("one of {}", fmt::join(words, ", ")));
    }
    return static_cast<std::size_t>(found - words.begin());
}

std::string DescribedOptions::range_help(std::string_view doc, double value, Range range) {
    return fmt::format("{} [{}; {} to {}]", doc, value, range.least, range.most);
}

} // namespace millpond
