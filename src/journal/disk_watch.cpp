#include "journal/disk_watch.hpp"

#include <cerrno>
#include <cstring>
#include <unistd.h>

namespace millpond {

double free_mb(const std::filesystem::path& folder) {
    std::error_code trouble;
    const auto space = std::filesystem::space(folder, trouble);
    return trouble ? 0.0 : static_cast<double>(space.available) / 1e6;
}

DiskWatch::DiskWatch(std::vector<int> descriptors, std::filesystem::path folder, double min_free_mb, Tell tell)
    : descriptors_(std::move(descriptors)), folder_(std::move(folder)), min_free_mb_(min_free_mb),
      tell_(std::move(tell)), thread_([this] { run(); }) {}

DiskWatch::~DiskWatch() {
    {
        const std::lock_guard lock(mutex_);
        stopping_ = true;
    }
    wake_.notify_all();
    thread_.join();
}

void DiskWatch::run() {
    std::unique_lock lock(mutex_);
    while (!wake_.wait_for(lock, std::chrono::seconds{1}, [this] { return stopping_; })) {
        lock.unlock();
        look();
        lock.lock();
    }
}

void DiskWatch::look() {
    for (const int descriptor : descriptors_) {
        if (::fdatasync(descriptor) != 0 && !sync_told_) {
            sync_told_ = true;
            tell_.sync_failed(std::strerror(errno));
        }
    }
    const auto free = free_mb(folder_);
    if (free < min_free_mb_ && !space_told_) {
        space_told_ = true;
        tell_.little_space(static_cast<std::uint64_t>(free));
    }
}

} // namespace millpond
