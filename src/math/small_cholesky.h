// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cmath>
#include <cstddef>

namespace foreglow {

// Cholesky's factor of matrices of a few rows, in place and without memory of their own (Golub & Van Loan,
// ch. 4). Rows is anything with a[i][j]; only the lower triangle is read and written.

/// Replaces the lower triangle of A by L with A = L L^T; returns false where A is not positive definite.
template <class Rows>
[[nodiscard]] bool factorize(Rows& a, std::size_t n) {
    for (std::size_t j = 0; j < n; ++j) {
        for (std::size_t i = j; i < n; ++i) {
            double sum = a[i][j];
            for (std::size_t k = 0; k < j; ++k)
                sum -= a[i][k] * a[j][k];
            if (i == j) {
                if (!(sum > 0)) return false;
                a[j][j] = std::sqrt(sum);
            } else {
                a[i][j] = sum / a[j][j];
            }
        }
    }
    return true;
}

/// Replaces b by L^-1 b.
template <class Rows, class Vector>
void solve_lower(const Rows& factor, std::size_t n, Vector& b) {
    for (std::size_t i = 0; i < n; ++i) {
        for (std::size_t k = 0; k < i; ++k)
            b[i] -= factor[i][k] * b[k];
        b[i] /= factor[i][i];
    }
}

/// Replaces b by L^-T b.
template <class Rows, class Vector>
void solve_upper(const Rows& factor, std::size_t n, Vector& b) {
    for (std::size_t i = n; i-- > 0;) {
        for (std::size_t k = i + 1; k < n; ++k)
            b[i] -= factor[k][i] * b[k];
        b[i] /= factor[i][i];
    }
}

}  // namespace foreglow
