// The kernel for every x86-64 processor.
#include "detector/kernel.hpp"

#include <immintrin.h>

#define MILLPOND_LANES 2
#define MILLPOND_SQRT(v) _mm_sqrt_pd(v)
#define MILLPOND_KERNEL run_kernel_sse2
#include "detector/kernel_body.inl"
