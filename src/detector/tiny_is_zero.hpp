// Numbers below 1e-308 count as zero while one of these lives. Thread: any; it sets the calling thread's own register.
#pragma once

#include <xmmintrin.h>

namespace millpond {

/// A flat channel would otherwise slow the arithmetic a hundredfold. Set where envelopes and floors are computed, not
/// by the thread, so that every command computes the same.
class TinyIsZero {
  public:
    TinyIsZero() noexcept : before_(_mm_getcsr()) { _mm_setcsr(before_ | 0x8040U); }
    ~TinyIsZero() { _mm_setcsr(before_); }
    TinyIsZero(const TinyIsZero&) = delete;
    TinyIsZero& operator=(const TinyIsZero&) = delete;

  private:
    unsigned before_;
};

} // namespace millpond
