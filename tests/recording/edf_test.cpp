// EDF+ read through EDFlib and checked against the bytes themselves.
#include "base/refusal.hpp"
#include "recording/recording_reader.hpp"
#include "recording/recording_writer.hpp"
#include "recording/whole_file.hpp"
#include "support/files.hpp"
#include "support/text.hpp"

#include <gtest/gtest.h>

#include <cmath>
#include <cstring>
#include <edflib.h>
#include <thread>

namespace millpond {
namespace {

struct Made {
    const char* label;
    int rate;
    const char* unit;
    double physical_max = 1000.0;
    double physical_min = -1000.0;
};

/// A file of `seconds` with a ramp of digital values 10 s + t in each signal, written by EDFlib.
std::filesystem::path edf(const std::filesystem::path& file, const std::vector<Made>& signals, int seconds = 2,
                          int filetype = EDFLIB_FILETYPE_EDFPLUS) {
    const int handle = edfopen_file_writeonly(file.c_str(), filetype, static_cast<int>(signals.size()));
    for (int i = 0; i < static_cast<int>(signals.size()); ++i) {
        const auto& signal = signals[static_cast<std::size_t>(i)];
        const bool bdf = filetype == EDFLIB_FILETYPE_BDFPLUS;
        edf_set_samplefrequency(handle, i, signal.rate);
        edf_set_physical_maximum(handle, i, signal.physical_max);
        edf_set_physical_minimum(handle, i, signal.physical_min);
        edf_set_digital_maximum(handle, i, bdf ? 8'000'000 : 32'000);
        edf_set_digital_minimum(handle, i, bdf ? -8'000'000 : -32'000);
        edf_set_label(handle, i, signal.label);
        edf_set_physical_dimension(handle, i, signal.unit);
    }
    for (int second = 0; second < seconds; ++second) {
        for (const auto& signal : signals) {
            std::vector<int> digital(static_cast<std::size_t>(signal.rate));
            for (int t = 0; t < signal.rate; ++t) {
                digital[static_cast<std::size_t>(t)] = 16 * (second * signal.rate + t);
            }
            edfwrite_digital_samples(handle, digital.data());
        }
    }
    edfwrite_annotation_utf8(handle, 5000, 2500, "rest begins");
    edfclose_file(handle);
    return file;
}

class Edf : public ::testing::Test {
  protected:
    std::string refusal(const std::filesystem::path& file, const std::string& sidecar = {}) {
        return test::line_of<Refusal>([&] {
            static_cast<void>(
                load_recording(file, sidecar.empty() ? std::filesystem::path{} : scratch_.file("s.yaml", sidecar)));
        });
    }
    test::TemporaryFolder scratch_;
};

TEST_F(Edf, PhysicalUnitsBecomeMicrovolts) {
    const auto file = edf(scratch_ / "a.edf", {{"one", 500, "uV"}, {"two", 500, "mV"}, {"three", 500, "V"}});
    const auto loaded = load_recording(file);
    EXPECT_EQ(loaded.info.format, "EDF+");
    EXPECT_EQ(loaded.info.rate.value, 500.0);
    EXPECT_EQ(loaded.info.frames, 1000u);
    EXPECT_EQ(loaded.info.channels, (Channels{{"one"}, {"two"}, {"three"}}));
    // Digital 16 t of 32000 for 1000 units: t / 2 units.
    EXPECT_NEAR(loaded.data[3 * 10], 5.0f, 1e-4f);
    EXPECT_NEAR(loaded.data[3 * 10 + 1], 5000.0f, 1e-1f);
    EXPECT_NEAR(loaded.data[3 * 10 + 2], 5e6f, 1e2f);
    EXPECT_NEAR(loaded.data[3 * 999], 499.5f, 1e-3f);
}

TEST_F(Edf, InvertedPhysicalRangeTurnsTheSign) {
    const auto file = edf(scratch_ / "a.edf", {{"up", 500, "uV"}, {"down", 500, "uV", -1000.0, 1000.0}});
    const auto loaded = load_recording(file);
    for (std::size_t i = 0; i < 1000; ++i) {
        ASSERT_NEAR(loaded.data[2 * i + 1], -loaded.data[2 * i], 1e-3f);
    }
}

// Field by field as Kemp et al. 1992 lay EDF out (widths from memory): 256 bytes of header, 256 a signal, then records.
TEST_F(Edf, PlainEdfIsRead) {
    const auto field = [](std::string text, std::size_t width) { return text + std::string(width - text.size(), ' '); };
    std::string bytes = field("0", 8) + field("X", 80) + field("X", 80) + "01.02.26" + "10.00.00" + field("512", 8) +
                        field("", 44) + field("1", 8) + field("1", 8) + field("1", 4);
    bytes += field("CA1", 16) + field("", 80) + field("mV", 8) + field("-1", 8) + field("1", 8) + field("-1000", 8) +
             field("1000", 8) + field("", 80) + field("4", 8) + field("", 32);
    bytes += std::string("\x00\x00\x01\x00\xff\xff\xe8\x03", 8); // 0, 1, -1, 1000
    const auto loaded = load_recording(scratch_.file("a.edf", bytes));
    EXPECT_EQ(loaded.info.format, "EDF");
    EXPECT_EQ(loaded.info.rate.value, 4.0);
    ASSERT_EQ(loaded.data.size(), 4u);
    EXPECT_NEAR(loaded.data[0], 0.0f, 1e-4f);
    EXPECT_NEAR(loaded.data[1], 1.0f, 1e-4f);
    EXPECT_NEAR(loaded.data[2], -1.0f, 1e-4f);
    EXPECT_NEAR(loaded.data[3], 1000.0f, 1e-3f);
}

TEST_F(Edf, TheSiblingOf24BitsIsRead) {
    const auto loaded = load_recording(edf(scratch_ / "a.bdf", {{"one", 500, "uV"}}, 2, EDFLIB_FILETYPE_BDFPLUS));
    EXPECT_EQ(loaded.info.format, "BDF+");
    EXPECT_NEAR(loaded.data[999], 999.0 * 16.0 / 8000.0, 1e-4);
}

TEST_F(Edf, RolesComeByLabel) {
    const auto file = edf(scratch_ / "a.edf", {{"one", 500, "uV"}, {"two", 500, "uV"}, {"three", 500, "uV"}});
    const auto sidecar =
        scratch_.file("s.yaml", "channels: [{name: three, role: reference}, {name: one, role: ripple}]\n");
    EXPECT_EQ(
        open_recording(file, sidecar)->info().channels,
        (Channels{{"one", ChannelRole::ripple}, {"two", ChannelRole::unused}, {"three", ChannelRole::reference}}));
}

TEST_F(Edf, RolesComeInOrderWhereNoNameIsALabel) {
    const auto file = edf(scratch_ / "a.edf", {{"one", 500, "uV"}, {"two", 500, "uV"}});
    const auto sidecar = scratch_.file("s.yaml", "channels: [{name: CA1}, {name: cortex, role: reference}]\n");
    EXPECT_EQ(open_recording(file, sidecar)->info().channels,
              (Channels{{"CA1", ChannelRole::ripple}, {"cortex", ChannelRole::reference}}));
}

TEST_F(Edf, NamesThatAreNoLabelsAreRefused) {
    const auto file = edf(scratch_ / "a.edf", {{"one", 500, "uV"}, {"two", 500, "uV"}});
    EXPECT_TRUE(test::says(refusal(file, "channels: [{name: one}, {name: owt}]\n"), "'owt'; allowed: labels"));
    EXPECT_TRUE(test::says(refusal(file, "channels: [{name: CA1}]\n"), "'CA1'"));
    EXPECT_TRUE(test::says(refusal(file, "rate_hz: 500\n"), "channels only"));
    EXPECT_TRUE(test::says(refusal(file, "channels: [{name: one, role: unused}]\n"), "no signal in use"));
}

TEST_F(Edf, SignalsOfAnotherRateAreRefusedUnlessUnused) {
    const auto file = edf(scratch_ / "a.edf", {{"LFP", 1000, "uV"}, {"speed", 50, "cm/s"}, {"EEG", 200, "uV"}});
    EXPECT_TRUE(test::says(refusal(file), "signal 'speed': found 50 Hz; allowed: 1000 Hz as of 'LFP'"));
    const auto sidecar = scratch_.file("s.yaml", "channels: [{name: LFP}]\n");
    const auto loaded = load_recording(file, sidecar);
    EXPECT_EQ(loaded.info.channels, (Channels{{"LFP"}}));
    EXPECT_EQ(loaded.info.frames, 2000u);
    EXPECT_NEAR(loaded.data[1999], 999.5f, 1e-3f);
}

TEST_F(Edf, OtherUnitsAreRefusedUnlessUnused) {
    const auto file = edf(scratch_ / "a.edf", {{"LFP", 500, "uV"}, {"temperature", 500, "degC"}});
    EXPECT_TRUE(test::says(refusal(file), "signal 'temperature': found unit 'degC'; allowed: uV, mV or V"));
    EXPECT_EQ(load_recording(file, scratch_.file("s.yaml", "channels: [{name: LFP}]\n")).info.channels.size(), 1u);
}

TEST_F(Edf, CutFilesAreRefused) {
    const auto file = edf(scratch_ / "a.edf", {{"one", 500, "uV"}}, 10);
    std::filesystem::resize_file(file, std::filesystem::file_size(file) * 6 / 10);
    EXPECT_TRUE(test::says(refusal(file), "not as EDF+ prescribes, or cut short"));
    std::filesystem::resize_file(file, 100);
    EXPECT_TRUE(test::says(refusal(file), "a.edf: found"));
}

TEST_F(Edf, InterruptedRecordingsAreRefused) {
    // EDF+ marks them with EDF+D where continuous ones have EDF+C (Kemp & Olivan 2003); here the mark is set by hand,
    // and one record's time keeping with it.
    const auto file = edf(scratch_ / "a.edf", {{"one", 500, "uV"}}, 3);
    auto bytes = read_whole_file(file);
    bytes.replace(bytes.find("EDF+C"), 5, "EDF+D");
    EXPECT_TRUE(test::says(refusal(scratch_.file("d.edf", bytes)), "d.edf: found an interrupted recording (EDF+D)"));
}

TEST_F(Edf, AnnotationsBecomeEvents) {
    const auto events = read_edf_annotations(edf(scratch_ / "a.edf", {{"one", 500, "uV"}}));
    ASSERT_EQ(events.size(), 1u);
    EXPECT_EQ(events[0].onset_s, 0.5);
    EXPECT_EQ(events[0].duration_s, 0.25);
    EXPECT_EQ(events[0].trial_type, "rest begins");
    EXPECT_EQ(events[0].sample, 250);
    EXPECT_THROW(static_cast<void>(read_edf_annotations(scratch_.file("a.txt", "no"))), Refusal);
}

TEST_F(Edf, SeveralReadersAndThreadsShareOneFile) {
    const auto file = edf(scratch_ / "a.edf", {{"one", 500, "uV"}, {"two", 500, "uV"}}, 20);
    const auto whole = load_recording(file);
    std::array<bool, 4> same{};
    std::vector<std::thread> threads;
    for (bool& result : same) {
        threads.emplace_back([&] {
            for (int i = 0; i < 20; ++i) {
                result = load_recording(file).data == whole.data;
            }
        });
    }
    for (auto& thread : threads) {
        thread.join();
    }
    EXPECT_EQ(same, (std::array<bool, 4>{true, true, true, true}));
    EXPECT_EQ(edflib_get_number_of_open_files(), 0);
}

class OutsideEdf : public ::testing::Test {
  protected:
    void SetUp() override {
        if (test::outside_recordings().empty()) {
            GTEST_SKIP() << "MILLPOND_RECORDINGS is not set: the outside recordings were NOT read";
        }
    }
    static std::filesystem::path file(const char* name) { return test::outside_recordings() / name; }
};

// Physical range 8711..-8711 uV over -32768..32767: a count is about -0.2659 uV. The file's records are decoded here by
// hand: 768 bytes of header, then records of 128 samples (16-bit little endian) and 40 bytes of annotations.
TEST_F(OutsideEdf, InvertedRangeIsDecodedAsTheHeaderSays) {
    const auto bytes = read_whole_file(file("eeg_subsecond_start.edf"));
    const auto loaded = load_recording(file("eeg_subsecond_start.edf"));
    EXPECT_EQ(loaded.info.format, "EDF+");
    EXPECT_EQ(loaded.info.rate.value, 128.0);
    EXPECT_EQ(loaded.info.frames, 698u * 128u);
    EXPECT_EQ(loaded.info.channels, (Channels{{"Fp1"}}));
    const std::size_t record_bytes = (bytes.size() - 768) / 698;
    for (std::size_t i = 0; i < loaded.info.frames; ++i) {
        std::int16_t count = 0;
        std::memcpy(&count, bytes.data() + 768 + i / 128 * record_bytes + i % 128 * 2, 2);
        const double expected = 8711.0 + (count + 32768.0) * (-8711.0 - 8711.0) / 65535.0;
        ASSERT_NEAR(loaded.data[i], expected, 1e-3);
    }
}

// The file's first record begins at 0.3945312 s after the full second; its first annotation stands at 2.3457031 s, so
// 1.9511719 s after the first sample.
TEST_F(OutsideEdf, AnnotationsCountFromTheFirstSampleOfASubSecondStart) {
    const auto events = read_edf_annotations(file("eeg_subsecond_start.edf"));
    ASSERT_EQ(events.size(), 4u);
    EXPECT_NEAR(events[0].onset_s, 2.3457031 - 0.3945312, 1e-6);
    EXPECT_EQ(events[0].trial_type, "XLSpike");
    EXPECT_EQ(events[0].sample, 250) << "1.9511719 s at 128 Hz";
    EXPECT_NEAR(events[3].onset_s, 583.9667968 - 0.3945312, 1e-6);
}

TEST_F(OutsideEdf, AnnotationsKeepTheirUtf8) {
    const auto events = read_edf_annotations(file("eeg_utf8_annotations.edf"));
    ASSERT_EQ(events.size(), 5u);
    EXPECT_NEAR(events[2].onset_s, 120.0 - 0.3945312, 1e-6) << "this file too begins 0.3945312 s after the second";
    EXPECT_EQ(events[2].trial_type,
              "\xe4\xb8\xad\xe6\x96\x87\xe6\xb5\x8b\xe8\xaf\x95\xe5\x85\xab\xe4\xb8\xaa\xe5\xad\x97");
}

} // namespace
} // namespace millpond
