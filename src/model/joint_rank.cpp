// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/joint_rank.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/parallel.h"
#include "base/random.h"

namespace foreglow {
namespace {

constexpr std::int64_t l_block = 16;       // a column's piece of it is a few cache lines
constexpr double largest_cl_ratio = 1e-4;  // interface page, as in transform_plan
constexpr double window_that_counts = 1e-3;
constexpr double power_that_counts = 1e-14;  // of a map's variance: below it only rounding is left
constexpr std::size_t most_skeletons = 96;

void add_power(const std::vector<const Alm*>& components, std::size_t first_l, std::size_t end_l,
               std::vector<Matrix>& spectra) {
    const std::size_t count = components.size();
    for (std::size_t m = 0; m < end_l; ++m) {
        const double both_signs = m == 0 ? 1.0 : 2.0;
        for (std::size_t l = std::max(m, first_l); l < end_l; ++l) {
            const std::size_t at = components.front()->index(static_cast<int>(l), static_cast<int>(m));
            for (std::size_t j = 0; j < count; ++j) {
                const auto a = components[j]->values()[at];
                for (std::size_t k = 0; k <= j; ++k) {
                    const auto b = components[k]->values()[at];
                    spectra[l](j, k) += both_signs * (a.real() * b.real() + a.imag() * b.imag());
                }
            }
        }
    }
}

std::vector<Matrix> spectra_of(const std::vector<std::vector<const Alm*>>& sets) {
    const std::size_t count = sets.front().size();
    const auto l_count = static_cast<std::size_t>(sets.front().front()->lmax()) + 1;
    std::vector<Matrix> spectra(l_count, Matrix(count, count));
    parallel_for_blocks(
        static_cast<std::int64_t>(l_count), l_block, [&](std::int64_t begin, std::int64_t end) {
            for (const auto& set : sets)
                add_power(set, static_cast<std::size_t>(begin), static_cast<std::size_t>(end), spectra);
            for (auto l = static_cast<std::size_t>(begin); l < static_cast<std::size_t>(end); ++l)
                for (std::size_t j = 0; j < count; ++j)
                    for (std::size_t k = 0; k < j; ++k)
                        spectra[l](k, j) = spectra[l](j, k);
        });
    return spectra;
}

// The lower triangle L with L L^T = a, for a semi-definite a: a pivot that is only rounding leaves a column
// of zeros.
Matrix semidefinite_root(const Matrix& a) {
    const std::size_t n = a.rows;
    Matrix root(n, n);
    for (std::size_t j = 0; j < n; ++j) {
        double pivot = a(j, j);
        for (std::size_t k = 0; k < j; ++k)
            pivot -= root(j, k) * root(j, k);
        if (!(pivot > 1e-15 * a(j, j))) continue;
        root(j, j) = std::sqrt(pivot);
        for (std::size_t i = j + 1; i < n; ++i) {
            double sum = a(i, j);
            for (std::size_t k = 0; k < j; ++k)
                sum -= root(i, k) * root(j, k);
            root(i, j) = sum / root(j, j);
        }
    }
    return root;
}

double quadratic(const Matrix& a, const std::vector<double>& x) {
    double sum = 0;
    for (std::size_t i = 0; i < a.rows; ++i) {
        double row = 0;
        for (std::size_t j = 0; j < a.columns; ++j)
            row += a(i, j) * x[j];
        sum += x[i] * row;
    }
    return std::max(sum, 0.0);
}

class Factorisation {
  public:
    Factorisation(std::span<const Matrix> spectra, const Matrix& weights,
                  std::span<const std::vector<double>> windows)
        : spectra_(spectra), weights_(weights), windows_(windows), rms_(weights.rows) {
        parallel_for_blocks(static_cast<std::int64_t>(rms_.size()), 1, [&](std::int64_t c, std::int64_t) {
            const auto channel = static_cast<std::size_t>(c);
            double power = 0;
            for (std::size_t l = 2; l < spectra_.size(); ++l)
                power += channel_power(channel, l);
            rms_[channel] = std::sqrt(power);
        });
    }

    [[nodiscard]] double rms(std::size_t channel) const { return rms_[channel]; }

    // [channels][projections]: random projections of the channels' a_lm, each channel scaled to unit rms.
    [[nodiscard]] Matrix make_sketch(std::size_t projections) const {
        const std::size_t count = weights_.columns;
        std::vector<Matrix> mixed(spectra_.size(), Matrix(count, projections));
        parallel_for_blocks(
            static_cast<std::int64_t>(spectra_.size()), 8, [&](std::int64_t begin, std::int64_t end) {
                for (auto l = static_cast<std::size_t>(begin); l < static_cast<std::size_t>(end); ++l)
                    mix(l, mixed[l]);
            });
        Matrix sketch(weights_.rows, projections);
        parallel_for_blocks(static_cast<std::int64_t>(weights_.rows), 1, [&](std::int64_t c, std::int64_t) {
            const auto channel = static_cast<std::size_t>(c);
            for (std::size_t l = 0; l < spectra_.size(); ++l)
                for (std::size_t k = 0; k < count; ++k) {
                    const double factor = windows_[channel][l] * weights_(channel, k);
                    for (std::size_t p = 0; p < projections; ++p)
                        sketch(channel, p) += factor * mixed[l](k, p);
                }
            const double scale = rms_[channel] > 0 ? 1.0 / rms_[channel] : 0.0;
            for (std::size_t p = 0; p < projections; ++p)
                sketch(channel, p) *= scale;
        });
        return sketch;
    }

    // The rms of map_c - sum over r of x_r map_r over that of map_c, and the worst ratio of their spectra.
    void measure(std::size_t channel, const JointRank& rank, double& error, double& cl_ratio) const {
        const std::size_t count = weights_.columns;
        std::vector<double> rest(count);
        double power = 0;
        cl_ratio = 0;
        for (std::size_t l = 0; l < spectra_.size(); ++l) {
            for (std::size_t k = 0; k < count; ++k)
                rest[k] = windows_[channel][l] * weights_(channel, k);
            for (std::size_t r = 0; r < rank.skeletons.size(); ++r) {
                const std::size_t s = rank.skeletons[r];
                const double factor = rank.coefficients(channel, r) * windows_[s][l];
                for (std::size_t k = 0; k < count; ++k)
                    rest[k] -= factor * weights_(s, k);
            }
            const double left = quadratic(spectra_[l], rest);
            power += left;
            const double window = windows_[channel][l];
            const double map_power = channel_power(channel, l);
            if (l >= 2 && window * window > window_that_counts &&
                map_power > power_that_counts * rms_[channel] * rms_[channel])
                cl_ratio = std::max(cl_ratio, left / map_power);
        }
        error = rms_[channel] > 0 ? std::sqrt(power) / rms_[channel] : 0.0;
    }

  private:
    [[nodiscard]] double channel_power(std::size_t channel, std::size_t l) const {
        std::vector<double> x(weights_.columns);
        for (std::size_t k = 0; k < x.size(); ++k)
            x[k] = windows_[channel][l] * weights_(channel, k);
        return quadratic(spectra_[l], x);
    }
    void mix(std::size_t l, Matrix& out) const {
        const Matrix root = semidefinite_root(spectra_[l]);
        Matrix random(root.columns, out.columns);
        for (std::size_t k = 0; k < random.rows; ++k)
            for (std::size_t p = 0; p + 1 < out.columns; p += 2) {
                const auto pair = normal_pair({0, 0, static_cast<std::uint32_t>(p)},
                                              static_cast<std::uint32_t>(l), static_cast<std::uint32_t>(k));
                random(k, p) = pair[0];
                random(k, p + 1) = pair[1];
            }
        const double scale = 1.0 / std::sqrt(static_cast<double>(out.columns));
        for (std::size_t i = 0; i < out.rows; ++i)
            for (std::size_t k = 0; k < root.columns; ++k)
                for (std::size_t p = 0; p < out.columns; ++p)
                    out(i, p) += scale * root(i, k) * random(k, p);
    }

    std::span<const Matrix> spectra_;
    const Matrix& weights_;
    std::span<const std::vector<double>> windows_;
    std::vector<double> rms_;
};

// Gram-Schmidt with pivoting on the rows of the sketch; the most independent channel comes first.
std::vector<std::size_t> order_by_independence(Matrix sketch, std::size_t most, double tolerance) {
    std::vector<std::size_t> order;
    std::vector<double> left(sketch.rows);
    const auto norm = [&](std::size_t row) {
        double sum = 0;
        for (std::size_t p = 0; p < sketch.columns; ++p)
            sum += sketch(row, p) * sketch(row, p);
        return std::sqrt(sum);
    };
    for (std::size_t row = 0; row < sketch.rows; ++row)
        left[row] = norm(row);
    while (order.size() < most) {
        const auto best = static_cast<std::size_t>(std::max_element(left.begin(), left.end()) - left.begin());
        if (!(left[best] > tolerance)) break;
        order.push_back(best);
        const double length = norm(best);
        std::vector<double> direction(sketch.columns);
        for (std::size_t p = 0; p < sketch.columns; ++p)
            direction[p] = sketch(best, p) / length;
        parallel_for_blocks(
            static_cast<std::int64_t>(sketch.rows), 16, [&](std::int64_t begin, std::int64_t end) {
                for (auto row = static_cast<std::size_t>(begin); row < static_cast<std::size_t>(end); ++row) {
                    double dot = 0;
                    for (std::size_t p = 0; p < sketch.columns; ++p)
                        dot += sketch(row, p) * direction[p];
                    for (std::size_t p = 0; p < sketch.columns; ++p)
                        sketch(row, p) -= dot * direction[p];
                    left[row] = norm(row);
                }
            });
        left[best] = 0;
    }
    return order;
}

JointRank plain(std::size_t channels) {
    JointRank rank;
    rank.coefficients = Matrix(channels, channels);
    for (std::size_t c = 0; c < channels; ++c) {
        rank.skeletons.push_back(c);
        rank.coefficients(c, c) = 1.0;
    }
    rank.errors.assign(channels, 0.0);
    rank.largest_sum = 1;
    rank.is_plain = true;
    return rank;
}

// Coefficients of all channels on the skeletons, by least squares on the sketch.
JointRank fit(const Matrix& sketch, std::vector<std::size_t> skeletons, const Factorisation& factorisation) {
    JointRank rank;
    rank.skeletons = std::move(skeletons);
    const std::size_t channels = sketch.rows;
    const std::size_t count = rank.skeletons.size();
    rank.coefficients = Matrix(channels, count);
    rank.errors.assign(channels, 0.0);
    std::vector<double> sums(channels), ratios(channels);
    parallel_for_blocks(static_cast<std::int64_t>(channels), 1, [&](std::int64_t c, std::int64_t) {
        const auto channel = static_cast<std::size_t>(c);
        const auto own = std::find(rank.skeletons.begin(), rank.skeletons.end(), channel);
        if (own != rank.skeletons.end()) {
            rank.coefficients(channel, static_cast<std::size_t>(own - rank.skeletons.begin())) = 1.0;
            sums[channel] = 1;
            return;
        }
        Matrix a(sketch.columns, count);
        std::vector<double> b(sketch.columns);
        for (std::size_t p = 0; p < sketch.columns; ++p) {
            for (std::size_t r = 0; r < count; ++r)
                a(p, r) = sketch(rank.skeletons[r], p);
            b[p] = sketch(channel, p);
        }
        const auto x = solve_least_squares(std::move(a), std::move(b));
        for (std::size_t r = 0; r < count; ++r) {
            sums[channel] += std::abs(x[r]);
            rank.coefficients(channel, r) =
                x[r] * factorisation.rms(channel) / factorisation.rms(rank.skeletons[r]);
        }
        factorisation.measure(channel, rank, rank.errors[channel], ratios[channel]);
    });
    rank.largest_sum = *std::max_element(sums.begin(), sums.end());
    rank.worst_cl_ratio = *std::max_element(ratios.begin(), ratios.end());
    return rank;
}

}  // namespace

std::vector<Matrix> component_spectra(const std::vector<Alm>& components) {
    std::vector<const Alm*> set;
    set.reserve(components.size());
    for (const Alm& alm : components)
        set.push_back(&alm);
    return spectra_of({set});
}

std::vector<Matrix> component_spectra(const std::vector<AlmEB>& components) {
    std::vector<const Alm*> e, b;
    e.reserve(components.size());
    b.reserve(components.size());
    for (const AlmEB& alm : components) {
        e.push_back(&alm.e);
        b.push_back(&alm.b);
    }
    return spectra_of({e, b});
}

JointRank make_joint_rank(std::span<const Matrix> spectra, const Matrix& weights,
                          std::span<const std::vector<double>> windows, double tolerance) {
    FOREGLOW_EXPECTS(!spectra.empty() && weights.rows == windows.size() && tolerance > 0);
    const std::size_t channels = weights.rows;
    if (channels < 3) return plain(channels);
    const Factorisation factorisation(spectra, weights, windows);
    const std::size_t most = std::min(channels - 1, most_skeletons);
    const Matrix sketch = factorisation.make_sketch(2 * ((most + 24) / 2));
    for (double pivot = tolerance; pivot > 1e-4 * tolerance; pivot *= 0.3) {
        auto skeletons = order_by_independence(sketch, most + 1, pivot);
        if (skeletons.empty() || skeletons.size() > most) break;
        JointRank rank = fit(sketch, std::move(skeletons), factorisation);
        const double worst = *std::max_element(rank.errors.begin(), rank.errors.end());
        if (worst <= tolerance && rank.worst_cl_ratio <= largest_cl_ratio) return rank;
    }
    return plain(channels);
}

}  // namespace foreglow
