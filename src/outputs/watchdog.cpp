#include "outputs/watchdog.hpp"

#include <algorithm>
#include <cerrno>
#include <csignal>
#include <cstring>
#include <fcntl.h>
#include <poll.h>
#include <sched.h>
#include <stdexcept>
#include <sys/mman.h>
#include <sys/prctl.h>
#include <sys/socket.h>
#include <sys/wait.h>
#include <unistd.h>

namespace millpond {
namespace {

constexpr char go_home = 'e';
// A busy computer may keep an ordinary process waiting for a second.
constexpr Nanos longest_stillness = std::chrono::seconds{3};
constexpr Nanos way_home = std::chrono::seconds{1};

struct Lines {
    std::array<WatchedLine, most_outputs> lines{};
    std::size_t count = 0;
};

// Everything from here to `watch` runs in the new process, which may have been forked while other threads held locks:
// system calls only.

void lower_all(const Lines& watched) {
    for (int attempt = 0; attempt < 3; ++attempt) {
        bool all = true;
        for (std::size_t i = 0; i < watched.count; ++i) {
            all = watched.lines[i].output->set_line(false) && all;
        }
        if (all) {
            return;
        }
        ::usleep(2000);
    }
}

void lower_those_held(const Lines& watched, LineBoard& board) {
    const auto now = monotonic_now().count();
    for (std::size_t i = 0; i < watched.count; ++i) {
        const auto since = board.high_since_ns(i);
        if (since != 0 && now - since > watched.lines[i].longest_high.count() &&
            watched.lines[i].output->set_line(false)) {
            board.lowered(i, since);
        }
    }
}

// An eighth of the shortest time to watch over: no line is high for much longer.
int look_every_ms(const Lines& watched) {
    Nanos shortest = std::chrono::seconds{1};
    for (std::size_t i = 0; i < watched.count; ++i) {
        shortest = std::min(shortest, watched.lines[i].longest_high);
    }
    return static_cast<int>(std::clamp<std::int64_t>(shortest.count() / 8'000'000, 1, 20));
}

void take_no_signals() {
    for (const int signal : {SIGINT, SIGTERM, SIGHUP, SIGQUIT, SIGTSTP, SIGPIPE, SIGUSR1, SIGUSR2, SIGALRM}) {
        std::signal(signal, SIG_IGN);
    }
    ::setsid();
}

void settle_in(WatchdogSettings settings) {
    ::prctl(PR_SET_NAME, "millpond-watch");
    if (const int nowhere = ::open("/dev/null", O_RDWR | O_CLOEXEC); nowhere >= 0) {
        ::dup2(nowhere, STDIN_FILENO);
        ::dup2(nowhere, STDOUT_FILENO);
        ::close(nowhere);
    }
    if (settings.priority > 0) {
        sched_param wanted{};
        wanted.sched_priority = settings.priority;
        ::sched_setscheduler(0, SCHED_FIFO, &wanted);
    }
    if (settings.lock_memory) {
        ::mlockall(MCL_CURRENT);
    }
}

[[noreturn]] void watch(const Lines& watched, LineBoard& board, int life_line) {
    const int every_ms = look_every_ms(watched);
    for (;;) {
        pollfd life{life_line, POLLIN, 0};
        if (::poll(&life, 1, every_ms) > 0) {
            char word = 0;
            if (::read(life_line, &word, 1) == 1 && word == go_home) {
                ::_exit(0);
            }
            lower_all(watched);
            constexpr char told[] = "millpond: the program died; its watchdog ordered every line low\n";
            (void)!::write(STDERR_FILENO, told, sizeof told - 1);
            ::_exit(1);
        }
        board.beat();
        lower_those_held(watched, board);
    }
}

} // namespace

Watchdog::Watchdog(std::span<const WatchedLine> lines, LineBoard& board, WatchdogSettings settings)
    : board_(board), beats_seen_(board.beats()) {
    Lines watched;
    watched.count = std::min(lines.size(), watched.lines.size());
    std::copy_n(lines.begin(), watched.count, watched.lines.begin());
    int ends[2];
    if (::socketpair(AF_UNIX, SOCK_STREAM | SOCK_CLOEXEC, 0, ends) != 0) {
        throw std::runtime_error(std::string("no way to a watchdog process: ") + std::strerror(errno));
    }
    process_ = ::fork();
    if (process_ == 0) {
        ::close(ends[1]);
        take_no_signals();
        settle_in(settings);
        watch(watched, board, ends[0]);
    }
    ::close(ends[0]);
    life_line_ = ends[1];
    if (process_ < 0) {
        ::close(life_line_);
        throw std::runtime_error(std::string("no watchdog process: ") + std::strerror(errno));
    }
}

Watchdog::~Watchdog() {
    // Word first, or the end of the line would read as this program's death.
    (void)::send(life_line_, &go_home, 1, MSG_NOSIGNAL);
    ::close(life_line_);
    const auto patience_ends = monotonic_now() + way_home;
    while (!ended_) {
        ended_ = ::waitpid(process_, nullptr, WNOHANG) != 0;
        if (!ended_ && monotonic_now() > patience_ends) {
            ::kill(process_, SIGKILL); // stopped, or it stands in a device: its word never reached it
        }
        ::usleep(ended_ ? 0 : 500);
    }
}

bool Watchdog::watches() noexcept {
    if (!ended_) {
        ended_ = ::waitpid(process_, nullptr, WNOHANG) == process_;
    }
    const auto now = monotonic_now();
    if (board_.beats() != beats_seen_) {
        beats_seen_ = board_.beats();
        beat_seen_at_ = now;
    }
    return !ended_ && now - beat_seen_at_ < longest_stillness;
}

} // namespace millpond
