// The command as a user runs it.
#include "audit/hand_made_session.hpp"
#include "support/process.hpp"

#include <gtest/gtest.h>
#include <nlohmann/json.hpp>

namespace millpond {
namespace {

using namespace test;

Ran audit(const std::string& arguments) {
    return run_millpond("audit " + arguments);
}

std::string eventful_session(const TemporaryFolder& temp) {
    HandMadeLoop loop(temp, test_engine_settings());
    run_eventful(loop);
    return loop.close().string();
}

TEST(AuditCommand, GoodSessionEndsWithStatus0AndTheVerdict) {
    const TemporaryFolder temp;
    const auto ran = audit(eventful_session(temp));
    EXPECT_EQ(ran.status, 0) << ran.err;
    EXPECT_NE(ran.out.find("every decision reproduced, all records intact"), std::string::npos) << ran.out;
}

TEST(AuditCommand, JsonAndTextSayTheSame) {
    const TemporaryFolder temp;
    const auto session = eventful_session(temp);
    const auto json = nlohmann::json::parse(audit(session + " --json").out);
    const auto text = audit(session).out;
    const auto detections = json.at("decisions").at("detections").get<int>();
    EXPECT_NE(text.find("  " + std::to_string(detections) + " detections"), std::string::npos) << text;
    EXPECT_EQ(json.at("rerun").at("differences").size(), 0U);
}

TEST(AuditCommand, DamageEndsWithStatus1AndSaysWhichOfTheTwo) {
    const TemporaryFolder temp;
    const auto session = eventful_session(temp);
    flip_bit(session + "/records.mpj", record_header_bytes + 3 * record_bytes + 9);
    const auto ran = audit(session);
    EXPECT_EQ(ran.status, 1);
    EXPECT_NE(ran.err.find("1 damaged places in the records"), std::string::npos) << ran.err;
}

TEST(AuditCommand, ChangedSettingsEndWithStatus1AndSaySo) {
    const TemporaryFolder temp;
    HandMadeLoop loop(temp, test_engine_settings());
    run_eventful(loop);
    const auto session = loop.close();
    Settings other;
    other.detector = loop.settings().detector;
    other.arbiter = loop.settings().arbiter;
    other.detector.threshold.deviations += 1.0;
    std::ofstream(session / "settings.yaml") << settings_to_yaml(other);
    const auto ran = audit(session.string());
    EXPECT_EQ(ran.status, 1);
    EXPECT_NE(ran.err.find("differences between journal and re-run"), std::string::npos) << ran.err;
}

TEST(AuditCommand, WhatIsNoSessionEndsWithStatus2InOneLine) {
    const TemporaryFolder temp;
    std::ofstream(temp.path() / "score.json") << "{}";
    const auto ran = audit(temp.path().string());
    EXPECT_EQ(ran.status, 2);
    EXPECT_NE(ran.err.find("the output of a dry run"), std::string::npos) << ran.err;
    EXPECT_EQ(std::count(ran.err.begin(), ran.err.end(), '\n'), 1);
}

TEST(AuditCommand, LabelsTakeTheRefereesPlace) {
    const TemporaryFolder temp;
    const auto labels = temp.path() / "labels.tsv";
    std::ofstream(labels) << "onset\tduration\ttrial_type\n9.8\t0.06\tripple\n9.0\t0.06\tartefact\n";
    const auto ran = audit(eventful_session(temp) + " --labels " + labels.string());
    EXPECT_EQ(ran.status, 0) << ran.err;
    EXPECT_NE(ran.out.find("labels.tsv: 1 ripples; early 0 ms"), std::string::npos) << ran.out;
}

TEST(AuditCommand, LabelsBeyondTheSessionsEndAreLeftOutAndSaidToBe) {
    const TemporaryFolder temp;
    const auto labels = temp.path() / "labels.tsv";
    std::ofstream(labels) << "onset\tduration\ttrial_type\n9.8\t0.06\tripple\n19.99\t0.01\tripple\n20\t0.06\tripple\n";
    const auto ran = audit(eventful_session(temp) + " --labels " + labels.string()); // 20 s long
    EXPECT_EQ(ran.status, 0) << ran.err;
    EXPECT_NE(ran.out.find("labels.tsv: 2 ripples; early 0 ms"), std::string::npos) << ran.out;
    EXPECT_NE(ran.err.find("1 of 3 ripples of " + labels.string()), std::string::npos) << ran.err;
}

TEST(AuditCommand, OutWritesAuditJsonAndRefusesToReplaceIt) {
    const TemporaryFolder temp;
    const auto session = eventful_session(temp);
    const auto out = (temp.path() / "out").string();
    EXPECT_EQ(audit(session + " --out " + out).status, 0);
    EXPECT_TRUE(std::filesystem::exists(out + "/audit.json"));
    EXPECT_EQ(audit(session + " --out " + out).status, 2);
    EXPECT_EQ(audit(session + " --out " + out + " --overwrite").status, 0);
}

} // namespace
} // namespace millpond
