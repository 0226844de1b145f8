// The role of everything that a pulse can go to.
#pragma once

namespace millpond {

class Output {
  public:
    virtual ~Output() = default;

    /// Orders the line high or low and returns when the device has taken the order. False: the order did not get
    /// through. Thread: loop, pulse, and any signal handler: allocates, locks and throws nothing, async-signal-safe.
    virtual bool set_line(bool high) noexcept = 0;
};

} // namespace millpond
