// Whether kernels for registers of four doubles can be compiled, and whether this machine can run them.
#pragma once

// The build stays at plain x86-64; single functions are compiled for AVX2 and FMA too and chosen at run time,
// so that one program serves all machines. Results then differ in the last bits between machines with and
// without, never between numbers of threads. Off under sanitizers, which are to see the code that runs
// everywhere.
#if defined(__x86_64__) && defined(__GNUC__) && !defined(__SANITIZE_ADDRESS__)
#define KILOAMP_WIDE_REGISTERS 1
#define KILOAMP_WIDE __attribute__((target("avx2,fma")))
#else
#define KILOAMP_WIDE_REGISTERS 0
#endif

namespace kiloamp::sparse {

[[nodiscard]] inline bool has_wide_registers() {
#if KILOAMP_WIDE_REGISTERS
  static const bool has = __builtin_cpu_supports("avx2") && __builtin_cpu_supports("fma");
  return has;
#else
  return false;
#endif
}

}  // namespace kiloamp::sparse
