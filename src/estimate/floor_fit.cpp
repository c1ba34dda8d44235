// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/floor_fit.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "base/parallel.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

constexpr std::int64_t block = 2048;

double product_of(std::span<const double> weights, std::span<const double> a, std::span<const double> b) {
    double sum = 0;
    for (std::size_t i = 0; i < a.size(); ++i)
        sum += weights[i] * a[i] * b[i];
    return sum;
}

void subtract(std::span<double> from, double factor, std::span<const double> what) {
    for (std::size_t i = 0; i < from.size(); ++i)
        from[i] -= factor * what[i];
}

/// Polynomials of degree 0 to K - 1 at the channels, orthonormal under some weights.
class SmoothBasis {
  public:
    SmoothBasis(std::span<const double> log_ratios, int terms)
        : x_(log_ratios.begin(), log_ratios.end()),
          polynomials_(static_cast<std::size_t>(terms), std::vector<double>(log_ratios.size())) {
        double largest = 0;
        for (const double x : x_)
            largest = std::max(largest, std::abs(x));
        if (largest > 0)
            for (double& x : x_)
                x /= largest;
    }

    void weigh(std::span<const double> weights) {
        weights_ = weights;
        for (std::size_t k = 0; k < polynomials_.size(); ++k) {
            std::vector<double>& now = polynomials_[k];
            for (std::size_t i = 0; i < now.size(); ++i)
                now[i] = k == 0 ? 1.0 : x_[i] * polynomials_[k - 1][i];
            for (int pass = 0; pass < 2; ++pass)
                for (std::size_t j = 0; j < k; ++j)
                    subtract(now, product_of(weights, now, polynomials_[j]), polynomials_[j]);
            const double norm = std::sqrt(product_of(weights, now, now));
            // Channels of one frequency leave no further polynomial.
            const double scale = norm > 1e-13 * std::sqrt(weights[0]) ? 1 / norm : 0.0;
            for (double& value : now)
                value *= scale;
        }
    }

    // Twice, since the first pass leaves rounding of the whole and the second only that of the residual.
    void subtract_fit(std::span<double> values) const {
        for (int pass = 0; pass < 2; ++pass)
            for (const std::vector<double>& polynomial : polynomials_)
                subtract(values, product_of(weights_, values, polynomial), polynomial);
    }

  private:
    std::vector<double> x_;
    std::vector<std::vector<double>> polynomials_;
    std::span<const double> weights_;
};

enum class PixelFate { Fitted, Undefined, NotPositive };

/// Fits pixel after pixel; one for each thread's block.
class PixelFloor {
  public:
    explicit PixelFloor(const FloorSetup& setup)
        : setup_(setup),
          basis_(setup.log_ratios, setup.terms),
          y_(setup.responses.size()),
          values_(y_.size()),
          weights_(y_.size(), 1.0) {
        if (!setup.noise.empty() && !setup.in_log)
            for (std::size_t c = 0; c < y_.size(); ++c)
                weights_[c] = std::pow(setup.responses[c] / setup.noise[c], 2);
        scale_weights();
        if (!has_own_weights()) basis_.weigh(weights_);
    }

    PixelFate fit(std::span<const std::vector<double>> maps, std::size_t pixel) {
        PixelFate fate = PixelFate::Fitted;
        for (std::size_t c = 0; c < y_.size(); ++c) {
            y_[c] = maps[c][pixel] / setup_.responses[c];
            if (!is_defined(y_[c])) return PixelFate::Undefined;
            if (setup_.in_log && !(y_[c] > 0)) fate = PixelFate::NotPositive;
        }
        if (fate != PixelFate::Fitted) return fate;
        if (has_own_weights()) {
            for (std::size_t c = 0; c < y_.size(); ++c)
                weights_[c] = std::pow(maps[c][pixel] / setup_.noise[c], 2);
            scale_weights();
            basis_.weigh(weights_);
        }
        for (std::size_t c = 0; c < y_.size(); ++c)
            values_[c] = setup_.in_log ? std::log(y_[c]) : y_[c];
        basis_.subtract_fit(values_);
        return fate;
    }

    // (y - fit) R; of a logarithm y - y exp(-r).
    [[nodiscard]] double residual(std::size_t channel) const {
        const double left = setup_.in_log ? -y_[channel] * std::expm1(-values_[channel]) : values_[channel];
        return left * setup_.responses[channel];
    }

  private:
    [[nodiscard]] bool has_own_weights() const { return setup_.in_log && !setup_.noise.empty(); }
    void scale_weights() {
        const double largest = *std::max_element(weights_.begin(), weights_.end());
        for (double& weight : weights_)
            weight /= largest;
    }

    const FloorSetup& setup_;
    SmoothBasis basis_;
    std::vector<double> y_, values_, weights_;
};

}  // namespace

void subtract_smooth_fit(std::span<const double> log_ratios, std::span<const double> weights, int terms,
                         std::span<double> values) {
    FOREGLOW_EXPECTS(terms >= 1 && log_ratios.size() == values.size() && weights.size() == values.size());
    SmoothBasis basis(log_ratios, terms);
    basis.weigh(weights);
    basis.subtract_fit(values);
}

FloorCounts make_floor_residuals(const FloorSetup& setup, std::span<const std::vector<double>> maps,
                                 std::span<std::vector<double>> residuals) {
    const std::size_t channels = setup.responses.size();
    FOREGLOW_EXPECTS(channels >= 1 && setup.log_ratios.size() == channels && maps.size() == channels &&
                     residuals.size() == channels && (setup.noise.empty() || setup.noise.size() == channels));
    FOREGLOW_EXPECTS(setup.terms >= 1 && setup.terms < static_cast<int>(channels));
    const auto pixels = static_cast<std::int64_t>(maps[0].size());
    std::vector<FloorCounts> counts(static_cast<std::size_t>((pixels + block - 1) / block));
    parallel_for_blocks(pixels, block, [&](std::int64_t begin, std::int64_t end) {
        PixelFloor floor(setup);
        FloorCounts& count = counts[static_cast<std::size_t>(begin / block)];
        for (auto p = static_cast<std::size_t>(begin); p < static_cast<std::size_t>(end); ++p) {
            const PixelFate fate = floor.fit(maps, p);
            count.fitted += fate == PixelFate::Fitted ? 1 : 0;
            count.undefined += fate == PixelFate::Undefined ? 1 : 0;
            count.not_positive += fate == PixelFate::NotPositive ? 1 : 0;
            for (std::size_t c = 0; c < channels; ++c)
                residuals[c][p] = fate == PixelFate::Fitted ? floor.residual(c) : undefined_pixel;
        }
    });
    FloorCounts total;
    for (const FloorCounts& one : counts) {
        total.fitted += one.fitted;
        total.undefined += one.undefined;
        total.not_positive += one.not_positive;
    }
    return total;
}

}  // namespace foreglow
