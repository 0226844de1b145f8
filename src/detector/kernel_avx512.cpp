// The kernel for processors with AVX-512.
#include "detector/kernel.hpp"

#include <immintrin.h>

#define MILLPOND_LANES 8
// Masked with all ones: the plain form trips a false warning of GCC 12.
#define MILLPOND_SQRT(v) _mm512_maskz_sqrt_pd(0xFF, v)
#define MILLPOND_KERNEL run_kernel_avx512
#include "detector/kernel_body.inl"
