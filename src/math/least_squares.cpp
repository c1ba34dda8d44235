// SPDX-License-Identifier: GPL-2.0-or-later
#include "math/least_squares.h"

#include <cmath>
#include <numeric>
#include <utility>

#include "base/error.h"

namespace foreglow {
namespace {

double squared_norm_below(const Matrix& a, std::size_t column, std::size_t first_row) {
    double sum = 0;
    for (std::size_t i = first_row; i < a.rows; ++i)
        sum += a(i, column) * a(i, column);
    return sum;
}

void bring_largest_column_forward(Matrix& a, std::vector<std::size_t>& order, std::size_t k) {
    std::size_t best = k;
    double best_norm = -1;
    for (std::size_t j = k; j < a.columns; ++j) {
        const double norm = squared_norm_below(a, j, k);
        if (norm > best_norm) {
            best_norm = norm;
            best = j;
        }
    }
    if (best == k) return;
    std::swap(order[k], order[best]);
    for (std::size_t i = 0; i < a.rows; ++i)
        std::swap(a(i, k), a(i, best));
}

// Makes column k zero below the diagonal by a reflection that also acts on the later columns and on b.
void reflect(Matrix& a, std::vector<double>& b, std::size_t k) {
    const double norm = std::sqrt(squared_norm_below(a, k, k));
    if (norm == 0) return;
    const double alpha = a(k, k) > 0 ? -norm : norm;
    std::vector<double> v(a.rows - k);
    for (std::size_t i = k; i < a.rows; ++i)
        v[i - k] = a(i, k);
    v[0] -= alpha;
    double vv = 0;
    for (const double x : v)
        vv += x * x;
    if (vv == 0) return;
    for (std::size_t j = k; j < a.columns; ++j) {
        double dot = 0;
        for (std::size_t i = k; i < a.rows; ++i)
            dot += v[i - k] * a(i, j);
        const double factor = 2 * dot / vv;
        for (std::size_t i = k; i < a.rows; ++i)
            a(i, j) -= factor * v[i - k];
    }
    double dot = 0;
    for (std::size_t i = k; i < a.rows; ++i)
        dot += v[i - k] * b[i];
    const double factor = 2 * dot / vv;
    for (std::size_t i = k; i < a.rows; ++i)
        b[i] -= factor * v[i - k];
}

}  // namespace

std::vector<double> solve_least_squares(Matrix a, std::vector<double> b) {
    FOREGLOW_EXPECTS(a.rows >= a.columns && b.size() == a.rows && a.columns >= 1);
    constexpr double negligible = 1e-13;
    std::vector<std::size_t> order(a.columns);
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::size_t rank = 0;
    for (; rank < a.columns; ++rank) {
        bring_largest_column_forward(a, order, rank);
        reflect(a, b, rank);
        if (!(std::abs(a(rank, rank)) > negligible * std::abs(a(0, 0)))) break;
    }
    std::vector<double> solution(a.columns, 0.0);
    for (std::size_t k = rank; k-- > 0;) {
        double sum = b[k];
        for (std::size_t j = k + 1; j < rank; ++j)
            sum -= a(k, j) * solution[order[j]];
        solution[order[k]] = sum / a(k, k);
    }
    return solution;
}

}  // namespace foreglow
