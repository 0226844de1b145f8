// Bad input of every kind, as typed: one line on standard error, exit status 2, nothing left behind.
#include "app/rig.hpp"

namespace millpond::test {
namespace {

std::vector<std::string> all_files(const std::filesystem::path& folder) {
    std::vector<std::string> files;
    for (const auto& entry : std::filesystem::recursive_directory_iterator(folder)) {
        files.push_back(std::filesystem::relative(entry.path(), folder).string());
    }
    std::sort(files.begin(), files.end());
    return files;
}

class BadInput : public ::testing::Test {
  protected:
    BadInput() {
        std::filesystem::create_directory(rig_ / "work");
        std::filesystem::rename(rig_.recording(6.0, "good.wav"), work("good.wav"));
        std::filesystem::rename(rig_ / "good.wav.yaml", work("good.wav.yaml"));
        std::filesystem::rename(rig_ / "good.wav.truth.tsv", work("good.tsv"));
        std::filesystem::rename(rig_.settings({}), work("good.yaml"));
    }

    [[nodiscard]] std::filesystem::path work(const std::string& name) const { return rig_ / "work" / name; }
    void file(const std::string& name, const std::string& content) const {
        std::ofstream(work(name), std::ios::binary) << content;
    }
    /// good.yaml with `from` replaced.
    void settings(const std::string& name, const std::string& from, const std::string& to) const {
        auto text = text_of(work("good.yaml"));
        const auto at = text.find(from);
        ASSERT_NE(at, std::string::npos) << from;
        file(name, text.replace(at, from.size(), to));
    }

    /// In the folder `work`: refused in one line that holds all `words`, and the folder is as before.
    void expect_refused(const std::string& arguments, const std::vector<std::string>& words) {
        const auto before = all_files(rig_ / "work");
        const auto ran = run(std::string("timeout 30 ") + MILLPOND_PROGRAM + " " + arguments, rig_ / "work");
        EXPECT_EQ(ran.status, 2) << arguments << "\n" << ran.err;
        EXPECT_EQ(lines_of(ran.err).size(), 1U) << arguments << "\n" << ran.err;
        EXPECT_EQ(count_in(ran.err, "\n"), 1U) << arguments << "\n" << ran.err;
        for (const auto& word : words) {
            EXPECT_NE(ran.err.find(word), std::string::npos) << arguments << "\nwithout '" << word << "': " << ran.err;
        }
        EXPECT_EQ(all_files(rig_ / "work"), before) << arguments;
    }
    void expect_dryrun_refused(const std::string& recording, const std::string& more,
                               const std::vector<std::string>& words) {
        expect_refused("dryrun " + recording + " --settings good.yaml --out dry " + more, words);
    }

    Rig rig_;
};

TEST_F(BadInput, OnTheCommandLine) {
    expect_refused("", {"command line"});
    expect_refused("listen good.yaml", {"command line: found 'listen'; allowed: preflight, dryrun, "});
    for (const std::string command : {"live", "dryrun", "tune", "sham", "audit", "synth", "feed", "preflight"}) {
        expect_refused(command, {"command line"});
        expect_refused(command + " --no-such-option", {"command line"});
    }
    expect_refused("live good.yaml --stop-after-s soon", {"command line", "--stop-after-s"});
    expect_refused("feed good.wav --speed -1", {"--speed"});
    expect_refused("feed good.wav --encoding L17", {"--encoding", "L17"});
    expect_refused("synth new.wav --sites 0", {"--sites", "found '0'"});
    expect_refused("synth new.mp3", {"new.mp3"});
}

TEST_F(BadInput, OfFilesThatAreNotThere) {
    expect_refused("live none.yaml", {"none.yaml"});
    expect_refused("preflight none.yaml", {"none.yaml"});
    expect_refused("dryrun none.wav --settings good.yaml --out dry", {"none.wav"});
    expect_refused("dryrun good.wav --settings none.yaml --out dry", {"none.yaml"});
    expect_dryrun_refused("good.wav", "--labels none.tsv", {"none.tsv"});
    expect_dryrun_refused("good.wav", "--referee none.yaml", {"none.yaml"});
    expect_dryrun_refused("good.wav", "--sidecar none.yaml", {"none.yaml"});
    expect_refused("feed none.wav", {"none.wav"});
    expect_refused("audit none", {"none"});
    expect_refused("sham yoked none.tsv --sampling-hz 1250 --out s.tsv", {"none.tsv"});
    expect_refused("sham check none.tsv --sampling-hz 1250", {"none.tsv"});
    expect_refused("synth new.wav --scene none.yaml", {"none.yaml"});
    expect_refused("tune none.wav --out tuned.yaml", {"none.wav"});
}

TEST_F(BadInput, InRecordings) {
    const auto whole = text_of(work("good.wav"));
    file("header.wav", whole.substr(0, 30));
    file("cut.wav", whole.substr(0, whole.size() / 2));
    file("noise.wav", std::string(5000, 'x'));
    file("empty.wav", "");
    file("not.edf", std::string(5000, 'x'));
    file("short.edf", "0       ");
    file("text.flac", "onset\tduration\n");
    for (const std::string name :
         {"header.wav", "cut.wav", "noise.wav", "empty.wav", "not.edf", "short.edf", "text.flac", "."}) {
        std::filesystem::copy_file(work("good.wav.yaml"), work(name + ".yaml"));
        expect_dryrun_refused(name, "", {name});
        expect_refused("feed " + name + " --to " + rig_.address(), {name});
    }
    std::filesystem::copy_file(work("good.wav"), work("unscaled.wav"));
    expect_dryrun_refused("unscaled.wav", "", {"unscaled.wav"}); // 16-bit counts and nobody says what one is worth
}

TEST_F(BadInput, InSettings) {
    settings("typo.yaml", "lockout_ms", "lockuot_ms");
    settings("range.yaml", "settle_s: 1", "settle_s: -1");
    settings("word.yaml", "kind: silent", "kind: loud");
    settings("syntax.yaml", "detector:", "detector: [");
    settings("twice.yaml", "start_armed: true", "start_armed: true\n  start_armed: false");
    settings("rate.yaml", "rate_hz: 1250", "rate_hz: 100");
    settings("address.yaml", "source: rtp", "source: rtp\n  listen_address: 0.0.0.0");
    file("list.yaml", "- 1\n- 2\n");
    const std::vector<std::pair<std::string, std::string>> bad{{"typo.yaml", "did you mean 'lockout_ms'?"},
                                                               {"range.yaml", "settle_s"},
                                                               {"word.yaml", "loud"},
                                                               {"syntax.yaml", "syntax.yaml"},
                                                               {"twice.yaml", "start_armed"},
                                                               {"list.yaml", "list.yaml"}};
    for (const auto& [name, words] : bad) {
        expect_refused("live " + name, {name, words});
        expect_refused("dryrun good.wav --settings " + name + " --out dry", {name, words});
        expect_refused("preflight " + name, {name, words});
    }
    expect_refused("live rate.yaml", {"rate.yaml", "rate_hz", "100"});
    expect_refused("live address.yaml", {"address.yaml", "listen_address", "0.0.0.0"});
}

TEST_F(BadInput, InSettingsThatDoNotFitTheRecording) {
    expect_refused("synth two.wav --sites 0", {"--sites"});
    ASSERT_EQ(run_millpond("synth " + work("two.wav").string() + " --duration-s 2 --sites 2").status, 0);
    expect_dryrun_refused("two.wav", "", {"good.yaml", "channels", "5 channels", "2"});
}

TEST_F(BadInput, InLabelsAndSchedules) {
    file("number.tsv", "onset\tduration\ttrial_type\n1.0\t0.1\tripple\n2.0\tlong\tripple\n");
    file("column.tsv", "start\tduration\ttrial_type\n1.0\t0.1\tripple\n");
    file("beyond.tsv", "onset\tduration\ttrial_type\n500.0\t0.1\tripple\n");
    expect_dryrun_refused("good.wav", "--labels number.tsv", {"number.tsv", "long"});
    expect_dryrun_refused("good.wav", "--labels column.tsv", {"column.tsv", "onset"});
    expect_dryrun_refused("good.wav", "--labels beyond.tsv", {"beyond.tsv"});

    file("order.tsv", "onset\tduration\ttrial_type\tsample\n2.0\t0\tscheduled\t2500\n1.0\t0\tscheduled\t1250\n");
    file("near.tsv", "onset\tduration\ttrial_type\tsample\n1.0\t0\tscheduled\t1250\n1.02\t0\tscheduled\t1275\n");
    settings("order.yaml", "start_armed", "condition: yoked\n  schedule_file: order.tsv\n  start_armed");
    settings("near.yaml", "start_armed", "condition: yoked\n  schedule_file: near.tsv\n  start_armed");
    for (const std::string name : {"order", "near"}) {
        expect_refused("sham check " + name + ".tsv --sampling-hz 1250", {name + ".tsv"});
        expect_refused("live " + name + ".yaml", {name + ".tsv"});
        expect_refused("dryrun good.wav --settings " + name + ".yaml --out dry", {name + ".tsv"});
    }
}

TEST_F(BadInput, OfFoldersThatAreNoSessionsOrExistAlready) {
    std::filesystem::create_directory(work("empty"));
    expect_refused("audit empty", {"empty"});
    expect_refused("audit good.wav", {"good.wav"});
    std::filesystem::create_directory(work("dry"));
    expect_dryrun_refused("good.wav", "", {"--out dry", "--overwrite"});
    expect_refused("synth good.wav", {"good.wav", "--overwrite"});
    file("s.tsv", "mine");
    expect_refused("sham rate-matched --rate-per-s 1 --duration-s 60 --sampling-hz 1250 --out s.tsv",
                   {"s.tsv", "--overwrite"});
    EXPECT_EQ(text_of(work("s.tsv")), "mine");
}

TEST_F(BadInput, OfAPortThatIsTaken) {
    RigSettings want;
    const auto session = rig_.live(rig_.settings(want, "first.yaml"));
    expect_refused("live good.yaml", {std::to_string(rig_.port())});
    session->send(SIGINT);
    EXPECT_EQ(session->status(), 0);
}

} // namespace
} // namespace millpond::test
