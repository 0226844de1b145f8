// What is left after the worst: the process killed, the disk full.
#include "base/clock.hpp"
#include "journal/session_reader.hpp"
#include "journal/session_support.hpp"
#include "journal/session_writer.hpp"

#include <gtest/gtest.h>

#include <csignal>
#include <random>
#include <sys/mount.h>
#include <sys/resource.h>
#include <sys/wait.h>
#include <thread>
#include <unistd.h>

namespace millpond {
namespace {

using namespace test;

// In the child: one note and one frame a millisecond, for ever. Each number goes through the pipe once it was pushed.
[[noreturn]] void write_for_ever(const SessionSettings& settings, int pipe) {
    auto writer = SessionWriter::open(settings, about_stream());
    for (std::uint64_t i = 0;; ++i) {
        const std::array<float, 2> frame{static_cast<float>(i), 1.0F};
        writer->store({SampleIndex{i}, 2, frame});
        writer->loop_sink().take(numbered_note(i));
        writer->time_packet({1000, 2000, 3000});
        const std::array<std::uint64_t, 2> told{i, static_cast<std::uint64_t>(realtime_now().count())};
        if (::write(pipe, told.data(), sizeof told) != sizeof told) {
            ::_exit(1);
        }
        std::this_thread::sleep_for(std::chrono::milliseconds{1});
    }
}

std::filesystem::path only_session_in(const std::filesystem::path& folder) {
    for (const auto& entry : std::filesystem::directory_iterator(folder)) {
        if (!entry.path().filename().string().starts_with(".")) {
            return entry.path();
        }
    }
    return {};
}

TEST(KilledSession, AllButTheLast100MsIsReadableWithEveryChecksumRight) {
    std::mt19937 random(20260301);
    for (int round = 0; round < 5; ++round) {
        const TemporaryFolder temp;
        std::array<int, 2> pipe{};
        ASSERT_EQ(::pipe(pipe.data()), 0);
        const auto child = ::fork();
        if (child == 0) {
            ::close(pipe[0]);
            write_for_ever(session_in(temp, round % 2 == 0 ? StoreSamples::rf64 : StoreSamples::w64), pipe[1]);
        }
        ::close(pipe[1]);
        // At random moments, counted in notes so that a slow machine has written something too.
        const auto kill_after = std::uniform_int_distribution<std::uint64_t>(150, 500)(random);
        std::array<std::uint64_t, 2> told{};
        std::vector<std::array<std::uint64_t, 2>> pushed;
        while (pushed.size() < kill_after && ::read(pipe[0], told.data(), sizeof told) == sizeof told) {
            pushed.push_back(told);
        }
        ::kill(child, SIGKILL);
        const auto killed_ns = static_cast<std::uint64_t>(realtime_now().count());
        ::waitpid(child, nullptr, 0);
        ::close(pipe[0]);
        std::uint64_t safe = 0; // notes that were pushed 100 ms before the kill
        while (safe < pushed.size() && pushed[safe][1] + 100'000'000 <= killed_ns) {
            ++safe;
        }

        const SessionReader session(only_session_in(temp.path()));
        EXPECT_TRUE(session.cut());
        EXPECT_TRUE(session.damage().empty());
        std::uint64_t next = 0;
        std::uint64_t timed = 0;
        for (const auto& event : session.events()) {
            if (event.kind == EventKind::note) {
                EXPECT_EQ(number_in(event), next++);
            } else if (event.kind == EventKind::latency_bins && event.code == static_cast<int>(LatencyPart::wake)) {
                for (const auto& bin : event.as<LatencyBins>().bins) {
                    timed += bin.count;
                }
            }
        }
        EXPECT_GE(next, safe) << "killed after " << kill_after;
        EXPECT_GE(timed, safe) << "killed after " << kill_after;
        EXPECT_GE(session.open_samples()->frames(), safe) << "killed after " << kill_after;
        EXPECT_GT(safe, 0U);
    }
}

// The child's verdict, since limits and mounts of a process are its own.
template <class Body> int exit_of(Body body) {
    const auto child = ::fork();
    if (child == 0) {
        ::_exit(body());
    }
    int status = 0;
    ::waitpid(child, &status, 0);
    return WIFEXITED(status) ? WEXITSTATUS(status) : 128;
}

bool wait_for(const std::function<bool()>& condition) {
    for (int i = 0; i < 2000 && !condition(); ++i) {
        std::this_thread::sleep_for(std::chrono::milliseconds{5});
    }
    return condition();
}

TEST(FullDisk, RecordsStopAtAWholeOneTheFlagIsSetAndTheFolderStaysReadable) {
    const TemporaryFolder temp;
    const auto verdict = exit_of([&temp] {
        std::signal(SIGXFSZ, SIG_IGN);
        const rlimit limit{20'000, 20'000}; // no multiple of a record behind the header
        ::setrlimit(RLIMIT_FSIZE, &limit);
        auto writer = SessionWriter::open(session_in(temp), about_stream());
        for (std::uint64_t i = 0; i < 1000; ++i) {
            writer->loop_sink().take(numbered_note(i));
        }
        if (!wait_for([&] { return writer->failed(); }) || writer->trouble() != JournalTrouble::disk_full) {
            return 1;
        }
        // Goes on draining: what comes later is counted, not waited for.
        writer->loop_sink().take(numbered_note(1000));
        return wait_for([&] { return writer->snapshot().notes == 1001 && !writer->snapshot().trouble.empty(); }) ? 0
                                                                                                                 : 2;
    });
    ASSERT_EQ(verdict, 0);
    const auto folder = only_session_in(temp.path());
    EXPECT_EQ((std::filesystem::file_size(folder / "records.mpj") - 64) % 72, 0U);
    const SessionReader session(folder);
    EXPECT_TRUE(session.cut());
    EXPECT_TRUE(session.damage().empty());
    EXPECT_EQ(session.events().size(), (20'000U - 64) / 72);
}

// A disk of 2 MB. Empty path where this user may not mount.
class SmallDisk {
  public:
    explicit SmallDisk(const std::filesystem::path& at) : at_(at) {
        std::filesystem::create_directories(at);
        mounted_ = ::mount("tmpfs", at.c_str(), "tmpfs", 0, "size=2m") == 0;
    }
    ~SmallDisk() {
        if (mounted_) {
            ::umount2(at_.c_str(), MNT_DETACH);
        }
    }
    SmallDisk(const SmallDisk&) = delete;
    SmallDisk& operator=(const SmallDisk&) = delete;
    [[nodiscard]] bool mounted() const { return mounted_; }

  private:
    std::filesystem::path at_;
    bool mounted_;
};

TEST(FullDisk, SamplesStopAtAWholeFrameAndLostFramesAreCounted) {
    const TemporaryFolder temp;
    const SmallDisk disk(temp.path() / "disk");
    if (!disk.mounted()) {
        GTEST_SKIP() << "NOT ALLOWED TO MOUNT A SMALL DISK: a full disk was not tried";
    }
    auto settings = session_in(temp, StoreSamples::rf64);
    settings.folder = temp.path() / "disk";
    auto writer = SessionWriter::open(settings, about_stream(3));
    const std::vector<float> block(3 * 2000, 1.0F);
    std::uint64_t stored = 0;
    ASSERT_TRUE(wait_for([&] {
        writer->store({SampleIndex{stored}, 3, block});
        stored += 2000;
        return writer->failed();
    }));
    EXPECT_TRUE(writer->trouble() == JournalTrouble::disk_full || writer->trouble() == JournalTrouble::little_space);
    EXPECT_FALSE(writer->snapshot().trouble.empty());
    try {
        writer->close(SampleIndex{stored});
    } catch (const std::exception&) {
        // The tables may find no room; the records must.
    }
    const SessionReader session(writer->folder());
    EXPECT_TRUE(session.damage().empty());
    EXPECT_EQ(session.torn_bytes(), 0U);
    const auto samples = session.open_samples();
    ASSERT_TRUE(samples.has_value());
    EXPECT_LT(samples->frames(), stored);
    EXPECT_GT(samples->frames(), 0U);
    EXPECT_GT(writer->snapshot().frames_dropped, 0U);
}

TEST(FullDisk, RecordsAreTakenUpAgainOnceThereIsRoomAndTellWhatWasLost) {
    const TemporaryFolder temp;
    const SmallDisk disk(temp.path() / "disk");
    if (!disk.mounted()) {
        GTEST_SKIP() << "NOT ALLOWED TO MOUNT A SMALL DISK: a full disk was not tried";
    }
    auto settings = session_in(temp);
    settings.folder = temp.path() / "disk";
    auto writer = SessionWriter::open(settings, about_stream());
    const auto ballast = temp.path() / "disk" / "ballast";
    {
        std::ofstream out(ballast, std::ios::binary);
        while (out << std::string(4096, 'x') && out.flush()) {
        }
    }
    std::uint64_t next = 0;
    ASSERT_TRUE(wait_for([&] {
        for (int i = 0; i < 100; ++i) {
            writer->loop_sink().take(numbered_note(next++));
        }
        return writer->trouble() == JournalTrouble::disk_full || writer->snapshot().events_dropped > 0;
    }));
    std::filesystem::remove(ballast);
    writer->close(SampleIndex{next});
    const SessionReader session(writer->folder());
    EXPECT_FALSE(session.cut());
    EXPECT_TRUE(session.damage().empty());
    std::uint64_t notes = 0, lost = 0;
    for (const auto& event : session.events()) {
        notes += event.kind == EventKind::note ? 1 : 0;
        lost += event.kind == EventKind::dropped ? event.as<CountDetail>().count : 0;
    }
    EXPECT_GT(lost, 0U);
    EXPECT_EQ(notes + lost, next);
}

} // namespace
} // namespace millpond
