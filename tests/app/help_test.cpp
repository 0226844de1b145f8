// What the program says about itself must be true: every example of every command's help works as typed.
#include "app/rig.hpp"

#include <net/if.h>
#include <regex>
#include <sched.h>
#include <sys/ioctl.h>

namespace millpond::test {
namespace {

TEST(Version, NamesVersionBuildTypeAndCompiler) {
    const auto ran = run_millpond("--version");
    EXPECT_EQ(ran.status, 0);
    EXPECT_TRUE(std::regex_match(ran.out, std::regex("millpond [0-9]+\\.[0-9]+\\.[0-9]+ "
                                                     "\\([A-Za-z]+, (GNU|Clang) [0-9.]+\\)\n")))
        << ran.out;
    EXPECT_EQ(ran.err, "");
}

/// The project's folder as after a build, so that what an example writes lands here.
void lay_out(const Rig& rig) {
    const std::filesystem::path source = MILLPOND_SOURCE_DIR;
    std::filesystem::create_directory(rig / "project");
    std::filesystem::create_directory_symlink(std::filesystem::path(MILLPOND_PROGRAM).parent_path(),
                                              rig / "project/build");
    for (const char* folder : {"config", "replay_files"}) {
        std::filesystem::copy(source / folder, rig / "project" / folder, std::filesystem::copy_options::recursive);
    }
}

/// A loopback of this process's own where the kernel grants it: examples use fixed ports, which others may have.
void take_own_loopback() {
    if (::unshare(CLONE_NEWNET) != 0 && ::unshare(CLONE_NEWUSER | CLONE_NEWNET) != 0) {
        std::printf("no loopback of our own: the examples' ports may be taken by others\n");
        return;
    }
    const int descriptor = ::socket(AF_INET, SOCK_DGRAM, 0);
    ifreq loopback{};
    std::snprintf(loopback.ifr_name, sizeof loopback.ifr_name, "lo");
    loopback.ifr_flags = IFF_UP | IFF_RUNNING;
    ::ioctl(descriptor, SIOCSIFFLAGS, &loopback);
    ::close(descriptor);
}

/// Commands under `Example:`, up to the first line that is no command.
std::vector<std::string> examples_in(const std::string& help) {
    std::vector<std::string> examples;
    const auto lines = lines_of(help);
    for (auto line = std::find(lines.begin(), lines.end(), "Example:"); line != lines.end(); ++line) {
        if (const auto start = line->find_first_not_of(' '); start != std::string::npos && *line != "Example:") {
            const auto words = line->substr(start);
            if (words.find("build/millpond ") == std::string::npos) {
                break;
            }
            examples.push_back(words);
        }
    }
    return examples;
}

/// Commands named in a help text, in its order.
std::vector<std::string> commands_in(const std::string& help) {
    std::vector<std::string> commands;
    const auto lines = lines_of(help);
    for (auto line = std::find(lines.begin(), lines.end(), "Subcommands:"); line != lines.end(); ++line) {
        std::smatch name;
        if (std::regex_search(*line, name, std::regex("^  ([a-z-]+) "))) {
            commands.push_back(name[1]);
        }
    }
    return commands;
}

class Help : public ::testing::Test {
  protected:
    Help() { lay_out(rig_); }

    std::vector<std::string> examples_of(const std::string& command) {
        const auto help = run_millpond(command + " --help");
        EXPECT_EQ(help.status, 0) << help.err;
        auto examples = examples_in(help.out);
        EXPECT_FALSE(examples.empty()) << command << " shows no example\n" << help.out;
        return examples;
    }
    Ran run_example(const std::string& example) { return run(example, rig_ / "project"); }
    void expect_examples_work(const std::string& command) {
        for (const auto& example : examples_of(command)) {
            const auto ran = run_example(example);
            EXPECT_EQ(ran.status, 0) << example << "\n" << ran.err;
        }
    }

    Rig rig_;
};

TEST_F(Help, EveryCommandShowsAnExample) {
    const auto top = run_millpond("--help");
    const auto commands = commands_in(top.out);
    EXPECT_EQ(commands, (std::vector<std::string>{"preflight", "dryrun", "tune", "sham", "assign", "live", "unblind",
                                                  "audit", "synth", "feed"}));
    for (const auto& command : commands) {
        examples_of(command);
    }
    for (const auto& command : commands_in(run_millpond("sham --help").out)) {
        examples_of("sham " + command);
    }
}

TEST_F(Help, ExampleOfPreflightWorks) {
    take_own_loopback();
    for (const auto& example : examples_of("preflight")) {
        const auto ran = run_example(example);
        EXPECT_TRUE(ran.status == 0 || ran.status == 1)
            << ran.err; // this computer may be unfit, and the command says so
        EXPECT_NE(ran.out.find(ran.status == 0 ? "\nfit: 0 bad" : "\nNOT FIT: "), std::string::npos) << ran.out;
    }
}

TEST_F(Help, ExamplesOfSynthAndDryrunAndShamWorkOneAfterTheOther) {
    expect_examples_work("synth");
    expect_examples_work("dryrun");
    expect_examples_work("sham");
    std::filesystem::remove(rig_ / "project/rate_matched.tsv"); // the next help makes the same one
    expect_examples_work("sham yoked");
    expect_examples_work("sham rate-matched");
    expect_examples_work("sham check");
}

TEST_F(Help, ExampleOfTuneWorks) {
    expect_examples_work("tune");
}

// Both are typed while the other runs; live's example ends by itself, and the audit's reads the session that it left.
TEST_F(Help, ExamplesOfLiveAndFeedAndAuditWorkTogether) {
    take_own_loopback();
    const auto live_examples = examples_of("live"), feed_examples = examples_of("feed");
    ASSERT_EQ(feed_examples.size(), 1U);
    Process live({"/bin/sh", "-c", live_examples.front()}, rig_ / "live", {"/dev/null", rig_ / "project", 0});
    ASSERT_TRUE(live.says("session folder ")) << live.err();
    Process feed({"/bin/sh", "-c", "exec " + feed_examples.front()}, rig_ / "feed", {"/dev/null", rig_ / "project", 0});
    EXPECT_EQ(live.status(), 0) << live.err();
    feed.send(SIGINT); // 90 s at real pace are more than a test needs
    EXPECT_EQ(feed.status(), 0) << feed.err();
    EXPECT_GT(Rig::frames_stored(Rig::folder_of(live)), 1250U) << "the feed's example reached the session of live's";
    for (const auto& example : examples_of("audit")) {
        const auto ran = run_example(example);
        EXPECT_EQ(ran.status, 0) << example << "\n" << ran.err;
    }
}

} // namespace
} // namespace millpond::test
