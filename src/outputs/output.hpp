// The role of everything that a pulse can go to.
#pragma once

namespace millpond {

class Output {
  public:
    virtual ~Output() = default;

    /// Orders the line high or low and returns when the device has taken the order. False: the order did not get
    /// through. Thread: loop, pulse, control, any signal handler, and the watchdog process, which has this object by
    /// fork: allocates, locks and throws nothing, async-signal-safe.
    virtual bool set_line(bool high) noexcept = 0;

    /// Whether the device is still there and answers; true where that cannot be asked. Thread: control, while others
    /// order.
    virtual bool answers() noexcept { return true; }

    /// Tries to have a lost device back, once and briefly. True: it takes orders again. A watchdog process started
    /// before holds the lost one still. Thread: control, while others order.
    virtual bool reopen() noexcept { return true; }
};

} // namespace millpond
