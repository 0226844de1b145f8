// Programs as child processes: started, watched, told to end; none of them outlives its test. Thread: test.
#pragma once

#include <algorithm>
#include <chrono>
#include <csignal>
#include <cstdlib>
#include <fcntl.h>
#include <filesystem>
#include <fstream>
#include <functional>
#include <netinet/in.h>
#include <sstream>
#include <stdexcept>
#include <string>
#include <sys/prctl.h>
#include <sys/resource.h>
#include <sys/socket.h>
#include <sys/wait.h>
#include <thread>
#include <unistd.h>
#include <utility>
#include <vector>

namespace millpond::testing {

/// What a wait may take at most: far more than any machine needs, so that only a defect reaches it.
inline constexpr std::chrono::seconds patience{60};

/// Looks every 5 ms until `condition` holds; false where it does not within `limit`.
inline bool wait_until(const std::function<bool()>& condition, std::chrono::seconds limit = patience) {
    const auto end = std::chrono::steady_clock::now() + limit;
    while (!condition()) {
        if (std::chrono::steady_clock::now() >= end) {
            return condition();
        }
        std::this_thread::sleep_for(std::chrono::milliseconds{5});
    }
    return true;
}

inline std::string text_in(const std::filesystem::path& file) {
    std::ifstream in(file, std::ios::binary);
    std::ostringstream text;
    text << in.rdbuf();
    return text.str();
}

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

inline bool has_program(const std::string& name) {
    return std::system(("command -v " + name + " >/dev/null 2>&1").c_str()) == 0;
}

/// A UDP port of the loopback address that nobody had a moment ago; no port is given out twice in one process.
inline int free_udp_port() {
    static std::vector<int> given;
    for (int attempt = 0; attempt < 1000; ++attempt) {
        const int descriptor = ::socket(AF_INET, SOCK_DGRAM, 0);
        sockaddr_in address{};
        address.sin_family = AF_INET;
        address.sin_addr.s_addr = htonl(INADDR_LOOPBACK);
        socklen_t size = sizeof address;
        const bool bound = ::bind(descriptor, reinterpret_cast<sockaddr*>(&address), size) == 0 &&
                           ::getsockname(descriptor, reinterpret_cast<sockaddr*>(&address), &size) == 0;
        ::close(descriptor);
        const int port = ntohs(address.sin_port);
        // ffmpeg wants an even port and takes the next for RTCP (RFC 3550, section 11).
        if (bound && port % 2 == 0 && std::find(given.begin(), given.end(), port) == given.end()) {
            given.push_back(port);
            return port;
        }
    }
    throw std::runtime_error("no free UDP port");
}

/// Whether somebody listens on a UDP port of this computer, by the kernel's own table.
inline bool udp_port_taken(int port) {
    char wanted[8];
    std::snprintf(wanted, sizeof wanted, ":%04X ", static_cast<unsigned>(port));
    return text_in("/proc/net/udp").find(wanted) != std::string::npos ||
           text_in("/proc/net/udp6").find(wanted) != std::string::npos;
}

class Process {
  public:
    struct Options {
        std::filesystem::path input = "/dev/null";
        std::filesystem::path working_folder = {}; ///< empty: this program's own
        std::uint64_t largest_file_bytes = 0;      ///< RLIMIT_FSIZE; 0: no limit
    };

    /// Standard output and standard error go to `log`.out and `log`.err. The child dies with this process.
    Process(std::vector<std::string> words, std::filesystem::path log, Options options)
        : out_(log.string() + ".out"), err_(log.string() + ".err") {
        std::vector<char*> pointers;
        for (auto& word : words) {
            pointers.push_back(word.data());
        }
        pointers.push_back(nullptr);
        std::ofstream(out_, std::ios::trunc).close();
        std::ofstream(err_, std::ios::trunc).close();
        child_ = ::fork();
        if (child_ == 0) {
            become(pointers, options);
        }
        if (child_ < 0) {
            throw std::runtime_error("cannot start " + words.front());
        }
    }
    Process(std::vector<std::string> words, std::filesystem::path log)
        : Process(std::move(words), std::move(log), Options()) {}
    ~Process() {
        if (running()) {
            ::kill(child_, SIGKILL);
            ::waitpid(child_, nullptr, 0);
        }
    }
    Process(const Process&) = delete;
    Process& operator=(const Process&) = delete;

    void send(int signal) {
        if (running()) {
            ::kill(child_, signal);
        }
    }
    bool running() {
        if (!ended_) {
            ended_ = ::waitpid(child_, &status_, WNOHANG) == child_;
        }
        return !ended_;
    }
    /// Exit status once it has ended, 128 + signal where one ended it; -1 where it has not within `limit`.
    int status(std::chrono::seconds limit = patience) {
        if (!wait_until([this] { return !running(); }, limit)) {
            return -1;
        }
        return WIFEXITED(status_) ? WEXITSTATUS(status_) : 128 + WTERMSIG(status_);
    }

    [[nodiscard]] std::string out() const { return text_in(out_); }
    [[nodiscard]] std::string err() const { return text_in(err_); }
    /// Until `words` stand in what it printed; false where it ended without them or `limit` went by.
    bool says(const std::string& words, std::chrono::seconds limit = patience) {
        const auto said = [&] {
            return out().find(words) != std::string::npos || err().find(words) != std::string::npos;
        };
        wait_until([&] { return said() || !running(); }, limit);
        return said();
    }

  private:
    [[noreturn]] void become(const std::vector<char*>& pointers, const Options& options) const {
        ::prctl(PR_SET_PDEATHSIG, SIGKILL);
        const int in = ::open(options.input.c_str(), O_RDONLY);
        const int out = ::open(out_.c_str(), O_WRONLY | O_APPEND);
        const int err = ::open(err_.c_str(), O_WRONLY | O_APPEND);
        const bool placed = ::dup2(in, 0) == 0 && ::dup2(out, 1) == 1 && ::dup2(err, 2) == 2 &&
                            (options.working_folder.empty() || ::chdir(options.working_folder.c_str()) == 0);
        if (options.largest_file_bytes > 0) {
            const rlimit limit{options.largest_file_bytes, options.largest_file_bytes};
            ::setrlimit(RLIMIT_FSIZE, &limit);
        }
        if (placed) {
            ::execvp(pointers[0], pointers.data());
        }
        ::_exit(127);
    }

    std::filesystem::path out_, err_;
    pid_t child_ = -1;
    int status_ = 0;
    bool ended_ = false;
};

struct Finished {
    int status;
    std::string out, err;
};

/// Runs a shell command to its end, in `folder` where given.
inline Finished run_shell(const std::string& command, const std::filesystem::path& log,
                          const std::filesystem::path& folder = {}, std::chrono::seconds limit = patience) {
    Process process({"/bin/sh", "-c", command}, log, {"/dev/null", folder, 0});
    const int status = process.status(limit);
    return {status, process.out(), process.err()};
}

} // namespace millpond::testing
