// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

/// Compiles a loop for several vector widths, chosen at run time; all give the same bits, since each step
/// rounds by itself.
#if defined(__x86_64__) && defined(__GNUC__) && !defined(__clang__) && !defined(__SANITIZE_ADDRESS__)
#define FOREGLOW_FITS_WIDE __attribute__((target_clones("default", "avx2")))
#else
#define FOREGLOW_FITS_WIDE
#endif

/// Lets a loop body take the width of the function that it stands in.
#define FOREGLOW_FITS_INLINE __attribute__((always_inline)) inline
