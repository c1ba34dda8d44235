// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstdint>

#include "sphere/alm.h"
#include "sphere/frame.h"

namespace foreglow {

/// Turns the a_lm of a sky given in one frame into those of the same sky in another.
///
/// With v_to = R v_from, the new field is g(R v) = f(v); computed with Wigner's d-matrices (HEALPix C++,
/// Risbo 1996 recursion). Memory: two matrices of (lmax + 1)(2 lmax + 1) doubles; operations grow as lmax^3.
void rotate_alm(Alm& alm, const Matrix3& rotation);
void rotate_alm(Alm& alm, Frame from, Frame to);

/// Likewise for polarization: E and B are scalars, so Q and U made of them are against the new frame's
/// meridians.
void rotate_alm(AlmEB& alm, const Matrix3& rotation);
void rotate_alm(AlmEB& alm, Frame from, Frame to);

/// Turns temperature and polarization at once, which costs little more than one of them.
void rotate_alm(Alm& temperature, AlmEB& polarization, const Matrix3& rotation);
void rotate_alm(Alm& temperature, AlmEB& polarization, Frame from, Frame to);

/// Returns the memory that a rotation takes besides the coefficients [bytes].
[[nodiscard]] std::int64_t rotation_bytes(int lmax);

}  // namespace foreglow
