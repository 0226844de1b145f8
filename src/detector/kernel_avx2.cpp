// The kernel for processors with AVX2.
#include "detector/kernel.hpp"

#include <immintrin.h>

#define MILLPOND_LANES 4
#define MILLPOND_SQRT(v) _mm256_sqrt_pd(v)
#define MILLPOND_KERNEL run_kernel_avx2
#include "detector/kernel_body.inl"
