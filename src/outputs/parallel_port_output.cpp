#include "outputs/parallel_port_output.hpp"

#include "base/clock.hpp"
#include "outputs/shared_page.hpp"

#include <linux/parport.h>
#include <linux/ppdev.h>
#include <sys/ioctl.h>

namespace millpond {
namespace {

// Far longer than a write takes. Whoever waited this long writes himself: the other may have been killed in the middle.
constexpr Nanos longest_wait{100'000};

} // namespace

ParallelPort::ParallelPort(const std::string& path, const std::string& where, DeviceControl control)
    : file_(path, where), control_(control), shared_(new_shared<Shared>()) {
    try {
        file_.open();
        if (!claim()) {
            refuse_device(file_, "a parallel port of ppdev, such as /dev/parport0 (modprobe ppdev)");
        }
    } catch (...) {
        delete_shared(shared_);
        throw;
    }
}

ParallelPort::~ParallelPort() {
    control_(file_.descriptor(), PPRELEASE, nullptr);
    delete_shared(shared_);
}

bool ParallelPort::claim() noexcept {
    int inward = 0;
    return control_(file_.descriptor(), PPCLAIM, nullptr) == 0 && control_(file_.descriptor(), PPDATADIR, &inward) == 0;
}

// Two threads, or this process and its watchdog, may change different bits at once. The byte in memory always has both;
// the port gets it from one writer at a time, who writes again where it changed meanwhile.
bool ParallelPort::set(std::uint8_t mask, std::uint8_t bits) noexcept {
    auto& data = shared_->data;
    auto old = data.load(std::memory_order_relaxed);
    while (!data.compare_exchange_weak(old, static_cast<std::uint8_t>((old & ~mask) | (bits & mask)),
                                       std::memory_order_seq_cst)) {
    }
    const Nanos patience_ends = monotonic_now() + longest_wait;
    while (shared_->writing.exchange(1, std::memory_order_seq_cst) != 0 && monotonic_now() < patience_ends) {
    }
    const bool written = write_data();
    shared_->writing.store(0, std::memory_order_seq_cst);
    return written;
}

bool ParallelPort::write_data() noexcept {
    std::uint8_t now = shared_->data.load(std::memory_order_seq_cst);
    for (;;) {
        std::uint8_t written = now;
        if (control_(file_.descriptor(), PPWDATA, &written) != 0) {
            return false;
        }
        now = shared_->data.load(std::memory_order_seq_cst);
        if (now == written) {
            return true;
        }
    }
}

bool ParallelPort::answers() noexcept {
    std::uint8_t status = 0;
    return control_(file_.descriptor(), PPRSTATUS, &status) == 0 && file_.exists();
}

bool ParallelPort::reopen() noexcept {
    return answers() || (file_.reopen() && claim()); // another output of this port may have had it back
}

ParallelPortOutput::ParallelPortOutput(const OutputSettings& settings, std::shared_ptr<ParallelPort> port)
    : port_(std::move(port)), mask_(static_cast<std::uint8_t>(settings.data_bits)), inverted_(settings.inverted) {
    set_line(false);
}

} // namespace millpond
