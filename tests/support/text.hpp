// What tests look for in texts. Thread: test.
#pragma once

#include <gtest/gtest.h>

#include <sstream>
#include <string>
#include <utility>
#include <vector>

namespace millpond::test {

inline std::vector<std::string> lines_of(const std::string& text) {
    std::vector<std::string> lines;
    std::istringstream in(text);
    for (std::string line; std::getline(in, line);) {
        lines.push_back(line);
    }
    return lines;
}

inline std::size_t count_in(const std::string& text, const std::string& words) {
    std::size_t count = 0;
    for (auto at = text.find(words); at != std::string::npos; at = text.find(words, at + words.size())) {
        ++count;
    }
    return count;
}

/// Whether `text` has `part` in it; shows the text where it has not.
inline ::testing::AssertionResult says(const std::string& text, const std::string& part) {
    return text.find(part) != std::string::npos
               ? ::testing::AssertionSuccess()
               : ::testing::AssertionFailure() << "no '" << part << "' in '" << text << "'";
}

/// The one line of the Refusal that `act` throws; empty where it throws none.
template <class Exception, class Act> std::string line_of(Act&& act) {
    try {
        act();
    } catch (const Exception& refusal) {
        return refusal.what();
    }
    return {};
}

} // namespace millpond::test
