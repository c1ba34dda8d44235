// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/rotation.h"

#include <alm.h>
#include <alm_powspec_tools.h>
#include <rotmatrix.h>

#include "base/error.h"

namespace foreglow {
namespace {

using HealpixAlm = ::Alm<xcomplex<double>>;

rotmatrix to_healpix(const Matrix3& r) {
    return {r[0][0], r[0][1], r[0][2], r[1][0], r[1][1], r[1][2], r[2][0], r[2][1], r[2][2]};
}

/// Lends our memory to the library's type, which rotates in place.
HealpixAlm lend(foreglow::Alm& alm) {
    arr<xcomplex<double>> memory(alm.values().data(), alm.values().size());
    HealpixAlm out;
    out.Set(memory, alm.lmax(), alm.lmax());
    return out;
}

}  // namespace

void rotate_alm(Alm& alm, const Matrix3& rotation) {
    HealpixAlm lent = lend(alm);
    ::rotate_alm(lent, to_healpix(rotation));
}

void rotate_alm(AlmEB& alm, const Matrix3& rotation) {
    Alm nothing(alm.e.lmax());
    rotate_alm(nothing, alm, rotation);
}

void rotate_alm(Alm& temperature, AlmEB& polarization, const Matrix3& rotation) {
    FOREGLOW_EXPECTS(temperature.lmax() == polarization.e.lmax() &&
                     temperature.lmax() == polarization.b.lmax());
    HealpixAlm t = lend(temperature), e = lend(polarization.e), b = lend(polarization.b);
    ::rotate_alm(t, e, b, to_healpix(rotation));
}

void rotate_alm(Alm& alm, Frame from, Frame to) {
    if (from != to) rotate_alm(alm, rotation_between(from, to));
}

void rotate_alm(AlmEB& alm, Frame from, Frame to) {
    if (from != to) rotate_alm(alm, rotation_between(from, to));
}

void rotate_alm(Alm& temperature, AlmEB& polarization, Frame from, Frame to) {
    if (from != to) rotate_alm(temperature, polarization, rotation_between(from, to));
}

std::int64_t rotation_bytes(int lmax) {
    const std::int64_t n = lmax;
    return 2 * (n + 1) * (2 * n + 1) * 8;
}

}  // namespace foreglow
