// SPDX-License-Identifier: BSL-1.0
#if !defined(NDEBUG) || !defined(__OPTIMIZE__)
#error "benches need an optimised build with NDEBUG: configure with -DCMAKE_BUILD_TYPE=Release"
#endif

// Linked into every bench, so that none can be built without this check.
extern int const steelyard_bench_guard;
int const steelyard_bench_guard = 1;
