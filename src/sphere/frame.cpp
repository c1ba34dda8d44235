// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/frame.h"

#include <cmath>

#include "base/constants.h"
#include "base/error.h"

namespace foreglow {
namespace {

constexpr double degree = constants::pi / 180.0;

Matrix3 transpose(const Matrix3& a) {
    Matrix3 out{};
    for (std::size_t i = 0; i < 3; ++i)
        for (std::size_t j = 0; j < 3; ++j)
            out[i][j] = a[j][i];
    return out;
}

Matrix3 product(const Matrix3& a, const Matrix3& b) {
    Matrix3 out{};
    for (std::size_t i = 0; i < 3; ++i)
        for (std::size_t j = 0; j < 3; ++j)
            for (std::size_t k = 0; k < 3; ++k)
                out[i][j] += a[i][k] * b[k][j];
    return out;
}

/// The axes of the new frame turned about z, x or z by an angle (a passive rotation).
Matrix3 about_z(double angle) {
    const double c = std::cos(angle), s = std::sin(angle);
    return {{{c, s, 0}, {-s, c, 0}, {0, 0, 1}}};
}

Matrix3 about_x(double angle) {
    const double c = std::cos(angle), s = std::sin(angle);
    return {{{1, 0, 0}, {0, c, s}, {0, -s, c}}};
}

/// From the three defining angles, so that it is orthogonal to rounding, which ten printed digits are not.
Matrix3 icrs_to_galactic() {
    const double pole_ra = 192.85948 * degree, pole_dec = 27.12825 * degree, node = 32.93192 * degree;
    return product(about_z(-node),
                   product(about_x(constants::pi / 2 - pole_dec), about_z(pole_ra + constants::pi / 2)));
}

Matrix3 from_icrs(Frame to) {
    switch (to) {
        case Frame::Galactic:
            return icrs_to_galactic();
        case Frame::Ecliptic:
            return about_x(23.4392911 * degree);
        case Frame::Icrs:
            break;
    }
    return {{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}};
}

}  // namespace

char coordsys_letter(Frame frame) {
    switch (frame) {
        case Frame::Galactic:
            return 'G';
        case Frame::Icrs:
            return 'C';
        case Frame::Ecliptic:
            break;
    }
    return 'E';
}

std::string to_text(Frame frame) {
    switch (frame) {
        case Frame::Galactic:
            return "galactic";
        case Frame::Icrs:
            return "icrs";
        case Frame::Ecliptic:
            break;
    }
    return "ecliptic";
}

Matrix3 rotation_between(Frame from, Frame to) {
    if (from == to) return from_icrs(Frame::Icrs);
    return product(from_icrs(to), transpose(from_icrs(from)));
}

Vector3 rotate(const Matrix3& rotation, const Vector3& v) {
    Vector3 out{};
    for (std::size_t i = 0; i < 3; ++i)
        out[i] = rotation[i][0] * v[0] + rotation[i][1] * v[1] + rotation[i][2] * v[2];
    return out;
}

}  // namespace foreglow
