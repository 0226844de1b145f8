#include "outputs/device_file.hpp"

#include "base/refusal.hpp"

#include <cerrno>
#include <cstring>
#include <fcntl.h>
#include <sys/file.h>
#include <sys/ioctl.h>
#include <unistd.h>

namespace millpond {
namespace {

constexpr int open_flags = O_RDWR | O_NOCTTY | O_NONBLOCK | O_CLOEXEC;

} // namespace

int control_device(int descriptor, unsigned long request, void* argument) noexcept {
    return ::ioctl(descriptor, request, argument);
}

void refuse_open(const std::string& where, const std::string& path) {
    if (path.empty()) {
        throw Refusal(where, "nothing", "the path of a device");
    }
    const auto found = path + " (" + std::strerror(errno) + ")";
    throw Refusal(where, found,
                  errno == EACCES || errno == EPERM ? "a device that this user may open: `ls -l` names its group"
                  : errno == EBUSY                  ? "a device that no other program uses"
                                                    : "a device that is there");
}

void refuse_device(const DeviceFile& file, const std::string& allowed) {
    throw Refusal(file.where(), file.path() + " (" + std::strerror(errno) + ")", allowed);
}

DeviceFile::~DeviceFile() {
    if (descriptor_ >= 0) {
        ::close(descriptor_);
    }
}

void DeviceFile::open() {
    const int opened = path_.empty() ? -1 : ::open(path_.c_str(), open_flags);
    if (opened < 0) {
        refuse_open(where_, path_);
    }
    adopt(opened);
}

void DeviceFile::adopt(int descriptor) {
    descriptor_ = descriptor;
    if (!hold()) {
        throw Refusal(where_, path_ + " (in use by another session)", "a device for this session alone");
    }
}

// Held by the open file itself, so that a watchdog process that has it by fork holds it too.
bool DeviceFile::hold() noexcept {
    held_ = ::flock(descriptor_, LOCK_EX | LOCK_NB) == 0;
    return held_;
}

bool DeviceFile::reopen() noexcept {
    const int opened = ::open(path_.c_str(), open_flags);
    const bool placed = opened >= 0 && ::dup3(opened, descriptor_, O_CLOEXEC) == descriptor_;
    if (opened >= 0) {
        ::close(opened);
    }
    if (placed) {
        hold();
    }
    return placed;
}

bool DeviceFile::exists() noexcept {
    if (!held_) {
        hold();
    }
    return ::access(path_.c_str(), F_OK) == 0;
}

} // namespace millpond
