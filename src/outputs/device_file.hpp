// A device file held by one session alone, and the one door to its driver. Thread: as each says.
#pragma once

#include <string>

namespace millpond {

/// ioctl(2), or what a test stands in its place. Returns -1 where the driver refuses.
using DeviceControl = int (*)(int descriptor, unsigned long request, void* argument) noexcept;

/// The kernel's own.
int control_device(int descriptor, unsigned long request, void* argument) noexcept;

class DeviceFile {
  public:
    /// Nothing is opened yet. `where` names the settings key, for refusals.
    DeviceFile(std::string path, std::string where) : path_(std::move(path)), where_(std::move(where)) {}
    ~DeviceFile();
    DeviceFile(const DeviceFile&) = delete;
    DeviceFile& operator=(const DeviceFile&) = delete;

    /// Opens and holds it. Refuses with the remedy what is not there, what this user may not open and what another
    /// session holds. Thread: control.
    void open();
    /// The same without a word; the new file takes the old one's number, so that nobody notices. Thread: control, while
    /// others use it.
    bool reopen() noexcept;
    /// Whether the path still leads to a device; holds it again where a watchdog's old copy kept `reopen` from that.
    /// Thread: control.
    [[nodiscard]] bool exists() noexcept;

    [[nodiscard]] int descriptor() const noexcept { return descriptor_; }
    [[nodiscard]] const std::string& path() const noexcept { return path_; }
    [[nodiscard]] const std::string& where() const noexcept { return where_; }

    /// Takes over an open descriptor of this path, as `open` does with its own. Thread: control.
    void adopt(int descriptor);

  private:
    bool hold() noexcept;

    std::string path_, where_;
    int descriptor_ = -1;
    bool held_ = false;
};

/// Refuses: this path is not such a device. Reads errno.
[[noreturn]] void refuse_device(const DeviceFile& file, const std::string& allowed);

/// The words for a failed open of `path`, from errno.
[[noreturn]] void refuse_open(const std::string& where, const std::string& path);

} // namespace millpond
