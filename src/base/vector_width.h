// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

// Compiles a loop for several vector widths, chosen at run time. All give the same bits: each step rounds by
// itself, since contraction into fused operations is off. (The sanitizers' start-up does not bear the
// choice.)
#if defined(__x86_64__) && defined(__GNUC__) && !defined(__clang__) && !defined(__SANITIZE_ADDRESS__)
#define FOREGLOW_WIDE __attribute__((target_clones("default", "avx2", "avx512f")))
#else
#define FOREGLOW_WIDE
#endif

// Lets a loop body take the width of the function that it stands in.
#define FOREGLOW_INLINE __attribute__((always_inline)) inline

// Says that no turn of the loop that follows reads what another one writes.
#if defined(__GNUC__) && !defined(__clang__)
#define FOREGLOW_INDEPENDENT _Pragma("GCC ivdep")
#else
#define FOREGLOW_INDEPENDENT
#endif
