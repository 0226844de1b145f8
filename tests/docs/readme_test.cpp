// What the texts say of commands, options, files and words is what the program and the tree have.
#include "base/event.hpp"
#include "docs/documents.hpp"
#include "settings/settings.hpp"
#include "support/files.hpp"
#include "support/process.hpp"

#include <fmt/format.h>
#include <gtest/gtest.h>

#include <map>

namespace millpond::test {
namespace {

const std::vector<std::string> documents{"README.md", "DEVELOPERS.md", "src/README.md"};

std::string document(const std::string& name) {
    return text_of(source_folder / name);
}

std::string help_of(const std::string& command) {
    const auto ran = run(std::string(MILLPOND_PROGRAM) + " " + command + " --help");
    EXPECT_EQ(ran.status, 0) << command;
    return ran.out;
}

// The names that a help text lists under `Subcommands:`, or under an empty one where it has none.
std::set<std::string> subcommands_in(const std::string& help) {
    return all_matches(between(help, "Subcommands:\n", "\n\n"), "(^|\n)  ([a-z][a-z-]*)", 2);
}

/// Help text by command; a command of two words ("sham yoked") has its own.
const std::map<std::string, std::string>& helps() {
    static const auto all = [] {
        std::map<std::string, std::string> found;
        for (const auto& command : subcommands_in(help_of(""))) {
            found[command] = help_of(command);
            for (const auto& inner : subcommands_in(found[command])) {
                found[command + " " + inner] = help_of(command + " " + inner);
            }
        }
        return found;
    }();
    return all;
}

bool is_option_of(const std::string& option, const std::string& help) {
    return std::regex_search(help, std::regex("(^|[ ,\n])" + option + "([ ,\n:=]|$)"));
}

/// A command line over several lines, as shells join them.
std::string joined(const std::string& text) {
    return std::regex_replace(text, std::regex("\\\\\n *"), "");
}

/// "audit" or "sham yoked" of a line that runs the program.
std::string command_of(const std::string& line) {
    std::smatch words;
    if (!std::regex_search(line, words, std::regex("build/millpond ([a-z]+)( [a-z-]+)?"))) {
        return {};
    }
    const auto both = words[1].str() + words[2].str();
    return helps().count(both) > 0 ? both : words[1].str();
}

std::string texts_of_scripts() {
    std::string texts;
    for (const auto* folder : {"tools", ".ci"}) {
        if (!std::filesystem::exists(source_folder / folder)) {
            continue;
        }
        for (const auto& entry : std::filesystem::directory_iterator(source_folder / folder)) {
            texts += entry.is_regular_file() ? text_of(entry.path()) : std::string{};
        }
    }
    return texts;
}

TEST(Readme, SettingsReferenceIsTheOneOfTheCode) {
    const auto block =
        between(document("README.md"), "<!-- settings reference: begin. Written by tools/update-readme -->\n\n",
                "\n<!-- settings reference: end -->");
    EXPECT_TRUE(block == settings_reference()) << "run tools/update-readme, which writes it anew";
}

/// What a command of the tour answers, as README shows it: indented, without its speed, in a folder of the test's own.
std::string answer_of(const std::string& command, const std::filesystem::path& folder) {
    const auto start = fmt::format("    build/millpond {} ", command);
    for (const auto& line : lines_of(joined(document("README.md")))) {
        if (line.starts_with(start)) {
            const auto there = std::regex_replace(line, std::regex("build/tour"), folder.string());
            auto said = run(fmt::format("cd {} && {} {} 2>/dev/null", source_folder.string(), MILLPOND_PROGRAM,
                                        there.substr(start.find(command))))
                            .out;
            said = std::regex_replace(said, std::regex(folder.string()), "build/tour");
            said = std::regex_replace(said, std::regex("[0-9]+ times real pace"), "many times real pace");
            return std::regex_replace(said, std::regex("(^|\n)(?=.)"), "$1    ");
        }
    }
    return {};
}

TEST(Readme, AnswersInTheTourAreThoseOfTheProgram) {
    const TemporaryFolder scratch;
    const auto folder = scratch / "tour";
    std::filesystem::create_directory(folder);
    ASSERT_FALSE(answer_of("synth", folder).empty());
    for (const std::string command : {"dryrun", "tune"}) {
        const auto shown =
            between(document("README.md"),
                    fmt::format("<!-- answer of {}: begin. Written by tools/update-readme -->\n\n", command),
                    fmt::format("\n<!-- answer of {}: end -->", command));
        EXPECT_EQ(shown, answer_of(command, folder)) << "run tools/update-readme, which writes it anew";
    }
}

TEST(Readme, NamesEveryCommandAndNoOther) {
    const auto named = all_matches(document("README.md"), "millpond ([a-z]+)[ `\n]", 1);
    std::set<std::string> there;
    for (const auto& [command, help] : helps()) {
        there.insert(command.substr(0, command.find(' ')));
    }
    ASSERT_FALSE(there.empty());
    for (const auto& command : there) {
        EXPECT_TRUE(named.count(command) > 0) << "README.md does not show " << command;
    }
    for (const auto& line : lines_of(joined(document("README.md")))) {
        if (has(line, "build/millpond ") && !has(line, "millpond --")) {
            EXPECT_TRUE(helps().count(command_of(line)) > 0) << line;
        }
    }
}

TEST(Documents, CommandLinesUseOptionsOfTheirCommand) {
    for (const auto& name : documents) {
        for (const auto& line : lines_of(joined(document(name)))) {
            const auto command = command_of(line);
            for (const auto& option :
                 command.empty() ? std::set<std::string>{} : all_matches(line, " (--[a-z][a-z0-9-]*)", 1)) {
                EXPECT_TRUE(is_option_of(option, helps().at(command)))
                    << name << ": " << command << " has no " << option;
            }
        }
    }
}

TEST(Documents, EveryLongOptionExistsSomewhere) {
    std::string known = texts_of_scripts();
    for (const auto& [command, help] : helps()) {
        known += help;
    }
    known += help_of("");
    for (const auto& name : documents) {
        for (const auto& option : all_matches(document(name), "[ `](--[a-z][a-z0-9-]*)", 1)) {
            EXPECT_TRUE(is_option_of(option, known)) << name << " names " << option;
        }
    }
}

// Names with capitals or stars stand for many files: tests/ROOM/*_test.cpp.
TEST(Documents, EveryFileOfTheProjectThatTheyNameExists) {
    const std::string folders = "(src|tests|tools|config|bench|replay_files|\\.ci)";
    for (const auto& name : documents) {
        for (auto file : all_matches(document(name), "(^|[ `(\"\n])(" + folders + "/[A-Za-z0-9_./*-]*)", 2)) {
            while (file.back() == '.' || file.back() == '/') {
                file.pop_back();
            }
            if (!has(file, "*") && !has(file, "NAME") && !has(file, "ROOM")) {
                EXPECT_TRUE(std::filesystem::exists(source_folder / file)) << name << " names " << file;
            }
        }
    }
}

TEST(Documents, EveryLinkLeadsToAFile) {
    for (const auto& name : documents) {
        const auto folder = (source_folder / name).parent_path();
        for (const auto& target : all_matches(document(name), "\\]\\(([^)#:]+)\\)", 1)) {
            EXPECT_TRUE(std::filesystem::exists(folder / target)) << name << " links to " << target;
        }
    }
}

TEST(Commands, EveryExampleUsesFilesThatExist) {
    for (const auto& [command, help] : helps()) {
        const auto example = help.substr(help.find("Example:"));
        for (const auto& file : all_matches(example, "(config|replay_files)/[A-Za-z0-9_.]+")) {
            EXPECT_TRUE(std::filesystem::exists(source_folder / file)) << command << ": " << file;
        }
        EXPECT_TRUE(has(example, "build/millpond " + command)) << example;
    }
}

template <class Code> void expect_named(int first, int last, const std::string& text) {
    std::size_t before = 0;
    for (int code = first; code <= last; ++code) {
        const auto row = fmt::format("\n| {} |", name_of(static_cast<Code>(code)));
        const auto at = text.find(row, before);
        EXPECT_NE(at, std::string::npos) << "README.md does not explain, or not in this place:" << row;
        before = at == std::string::npos ? before : at;
    }
}

// In the order of the code too: a detection is withheld by the first rule that applies.
TEST(Readme, ExplainsEveryWordThatTablesAndReportsUse) {
    const auto readme = document("README.md");
    expect_named<Rule>(1, rule_count - 1, readme);
    expect_named<PacketCause>(0, packet_cause_count - 1, readme);
    expect_named<GapCause>(1, 3, readme);
    expect_named<ArmState>(0, 2, readme);
    expect_named<LatencyPart>(0, latency_part_count - 1, readme);
}

TEST(Developers, GiveTheReasonForEveryLibrary) {
    const auto developers = document("DEVELOPERS.md");
    const auto libraries = all_matches(text_of(source_folder / "tools/debian-packages.txt"),
                                       "(^|\n)((?!libclang)(lib|nlohmann)[a-z0-9-]+-dev) ", 2);
    ASSERT_FALSE(libraries.empty());
    for (const auto& library : libraries) {
        EXPECT_TRUE(has(developers, "| " + library + " |")) << library;
    }
}

TEST(Changelog, BeginsWithWhatIsUnreleased) {
    EXPECT_EQ(*all_matches(document("CHANGELOG.md").substr(0, 400), "\n## ([A-Za-z]+)", 1).begin(), "Unreleased");
}

} // namespace
} // namespace millpond::test
