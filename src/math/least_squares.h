// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>
#include <vector>

namespace foreglow {

/// A dense matrix, row by row.
struct Matrix {
    std::size_t rows = 0, columns = 0;
    std::vector<double> values;

    Matrix() = default;
    Matrix(std::size_t row_count, std::size_t column_count)
        : rows(row_count), columns(column_count), values(row_count * column_count) {}
    [[nodiscard]] double& operator()(std::size_t row, std::size_t column) {
        return values[row * columns + column];
    }
    [[nodiscard]] double operator()(std::size_t row, std::size_t column) const {
        return values[row * columns + column];
    }
};

/// Finds x that minimises |A x - b|^2 by Householder QR with column pivoting (Golub & Van Loan, ch. 5).
///
/// Columns whose pivot falls below 1e-13 of the largest are left out (their x is 0), so that a deficient A is
/// no error.
/// @param a  [rows][columns], rows >= columns
/// @param b  [rows]
/// @return   [columns]
[[nodiscard]] std::vector<double> solve_least_squares(Matrix a, std::vector<double> b);

}  // namespace foreglow
