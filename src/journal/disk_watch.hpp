// Once a second: puts what was written onto the disk, and looks how much room is left.
// A thread of its own, so that a slow disk does not hold up the draining of rings.
#pragma once

#include <condition_variable>
#include <cstdint>
#include <filesystem>
#include <functional>
#include <mutex>
#include <string>
#include <thread>
#include <vector>

namespace millpond {

class DiskWatch {
  public:
    /// Told at most once each, from the watch's thread.
    struct Tell {
        std::function<void(const std::string& what)> sync_failed;
        std::function<void(std::uint64_t free_mb)> little_space;
    };

    /// `descriptors` stay open until the watch is gone.
    DiskWatch(std::vector<int> descriptors, std::filesystem::path folder, double min_free_mb, Tell tell);
    /// Waits for a sync under way.
    ~DiskWatch();
    DiskWatch(const DiskWatch&) = delete;
    DiskWatch& operator=(const DiskWatch&) = delete;

  private:
    void run();
    void look();

    std::vector<int> descriptors_;
    std::filesystem::path folder_;
    double min_free_mb_;
    Tell tell_;
    bool sync_told_ = false, space_told_ = false;
    std::mutex mutex_;
    std::condition_variable wake_;
    bool stopping_ = false;
    std::thread thread_;
};

/// Megabytes (10^6 bytes) that a user may still write there; 0 where it cannot be told.
[[nodiscard]] double free_mb(const std::filesystem::path& folder);

} // namespace millpond
