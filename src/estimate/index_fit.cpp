// SPDX-License-Identifier: GPL-2.0-or-later
#include "estimate/index_fit.h"

#include <algorithm>
#include <cmath>

#include "base/error.h"
#include "math/small_cholesky.h"
#include "sphere/sky_map.h"

namespace foreglow {
namespace {

constexpr std::size_t most_parameters = 3;
constexpr double exactness =
    1e-6;  // relative error of a survey that claims none: weights stay finite and matrices regular

using Parameters = std::array<double, most_parameters>;
using Small = std::array<Parameters, most_parameters>;
using Column = std::array<double, most_surveys>;
using Square = std::array<Column, most_surveys>;
using Response = std::array<Column, most_parameters>;  // [parameters][surveys]

/// The fit of one pixel: its defined surveys, and the current model.
class PixelFit {
  public:
    PixelFit(const IndexFitSetup& setup, std::span<const double> values, std::span<const double> variances)
        : setup_(setup), parameters_(setup.curvature ? 3 : 2) {
        for (std::size_t i = 0; i < values.size(); ++i) {
            if (!is_defined(values[i]) || !is_defined(variances[i])) continue;
            survey_[n_] = i;
            data_[n_] = values[i];
            noise_[n_] = variances[i];
            const double x = setup.log_ratios[i];
            design_[n_] = {1.0, x, x * x};
            ++n_;
        }
    }

    IndexFit run() {
        IndexFit out;
        out.surveys = n_;
        out.verdict = find_verdict();
        if (out.verdict != IndexVerdict::Good) return out;
        out.in_linear_space = !has_high_signal();
        const bool solved = out.in_linear_space ? fit_linear() : fit_log();
        if (solved)
            write(out);
        else
            out.verdict = is_lost() ? IndexVerdict::Undecided : IndexVerdict::NotConverged;
        return out;
    }

  private:
    [[nodiscard]] IndexVerdict find_verdict() const {
        if (different_frequencies() < parameters_) return IndexVerdict::TooFew;
        const auto positive = static_cast<std::size_t>(std::count_if(
            data_.begin(), data_.begin() + static_cast<std::ptrdiff_t>(n_), [](double d) { return d > 0; }));
        return positive < parameters_ ? IndexVerdict::NotPositive : IndexVerdict::Good;
    }

    [[nodiscard]] std::size_t different_frequencies() const {
        std::size_t count = 0;  // surveys are ascending in frequency
        for (std::size_t i = 0; i < n_; ++i)
            count += i == 0 || design_[i][1] != design_[i - 1][1] ? 1U : 0U;
        return count;
    }

    [[nodiscard]] double zero_covariance(std::size_t i, std::size_t j) const {
        return setup_.zero_level_covariance(survey_[i], survey_[j]);
    }

    [[nodiscard]] bool has_high_signal() const {
        for (std::size_t i = 0; i < n_; ++i)
            if (!(data_[i] > log_space_signal_to_noise * std::sqrt(noise_[i] + zero_covariance(i, i))))
                return false;
        return true;
    }

    [[nodiscard]] double log_model(std::size_t i) const {
        double sum = 0;
        for (std::size_t k = 0; k < parameters_; ++k)
            sum += design_[i][k] * theta_[k];
        return sum;
    }

    void update_model() {
        for (std::size_t i = 0; i < n_; ++i)
            model_[i] = std::exp(log_model(i));
    }

    // The covariance of ln T_i to first order, so that rows of any brightness are of one size; its factor,
    // and the normal matrix of the parameters with it.
    bool weigh() {
        for (std::size_t i = 0; i < n_; ++i)
            for (std::size_t j = 0; j <= i; ++j)
                covariance_[i][j] = zero_covariance(i, j) / (model_[i] * model_[j]);
        for (std::size_t i = 0; i < n_; ++i) {
            const double gain = setup_.calibration_errors[survey_[i]];
            covariance_[i][i] += noise_[i] / (model_[i] * model_[i]) + gain * gain;
            covariance_[i][i] = std::max(covariance_[i][i], exactness * exactness);
        }
        factor_ = covariance_;
        if (!factorize(factor_, n_)) return false;
        for (std::size_t k = 0; k < parameters_; ++k) {
            for (std::size_t i = 0; i < n_; ++i)
                weighted_[k][i] = design_[i][k];
            solve_lower(factor_, n_, weighted_[k]);
        }
        for (std::size_t k = 0; k < parameters_; ++k)
            for (std::size_t m = 0; m <= k; ++m) {
                double sum = 0;
                for (std::size_t i = 0; i < n_; ++i)
                    sum += weighted_[k][i] * weighted_[m][i];
                normal_[k][m] = sum;
            }
        normal_factor_ = normal_;
        return factorize(normal_factor_, parameters_);
    }

    // Solves (normal + damping on its diagonal) step = weighted^T L^-1 residual.
    bool solve(Column residual, double damping, Parameters& step, double& chi_square) const {
        solve_lower(factor_, n_, residual);
        chi_square = 0;
        for (std::size_t i = 0; i < n_; ++i)
            chi_square += residual[i] * residual[i];
        Small matrix = normal_;
        for (std::size_t k = 0; k < parameters_; ++k) {
            matrix[k][k] *= 1 + damping;
            step[k] = 0;
            for (std::size_t i = 0; i < n_; ++i)
                step[k] += weighted_[k][i] * residual[i];
        }
        if (!factorize(matrix, parameters_)) return false;
        solve_lower(matrix, parameters_, step);
        solve_upper(matrix, parameters_, step);
        return true;
    }

    // Two passes: weights from the data, which pull towards what noise made bright, then from the fit.
    bool fit_log() {
        model_ = data_;
        for (int pass = 0; pass < 2; ++pass) {
            if (!weigh()) return false;
            Column logs{};
            for (std::size_t i = 0; i < n_; ++i)
                logs[i] = std::log(data_[i]) + 0.5 * noise_[i] / (model_[i] * model_[i]);
            double unused = 0;
            if (!solve(logs, 0, theta_, unused)) return false;
            update_model();
        }
        return weigh();
    }

    // Tells whether the fit has sunk so deep below the noise that too few surveys see it.
    [[nodiscard]] bool is_lost() const {
        constexpr double deep = 0.01;
        std::size_t seen = 0;
        for (std::size_t i = 0; i < n_; ++i)
            seen += model_[i] > deep * std::sqrt(noise_[i] + zero_covariance(i, i)) ? 1U : 0U;
        return seen < parameters_;
    }

    // A start from what is positive, with at least one sigma for what is not.
    bool start_linear() {
        for (std::size_t i = 0; i < n_; ++i) {
            const double sigma = std::sqrt(noise_[i] + zero_covariance(i, i));
            model_[i] = data_[i] > sigma || sigma == 0 ? std::abs(data_[i]) : sigma;
            if (!(model_[i] > 0)) return false;
        }
        if (!weigh()) return false;
        Column logs{};
        for (std::size_t i = 0; i < n_; ++i)
            logs[i] = std::log(model_[i]);
        double unused = 0;
        if (!solve(logs, 0, theta_, unused)) return false;
        update_model();
        return true;
    }

    // The residual in units of the model; the model's own change is taken along by the caller's weights.
    [[nodiscard]] Column residual_of(const Parameters& theta, const Column& scale) const {
        Column out{};
        for (std::size_t i = 0; i < n_; ++i) {
            double sum = 0;
            for (std::size_t k = 0; k < parameters_; ++k)
                sum += design_[i][k] * theta[k];
            out[i] = (data_[i] - std::exp(sum)) / scale[i];
        }
        return out;
    }

    [[nodiscard]] double chi_square_of(const Parameters& theta, const Column& scale) const {
        Column residual = residual_of(theta, scale);
        solve_lower(factor_, n_, residual);
        double sum = 0;
        for (std::size_t i = 0; i < n_; ++i)
            sum += residual[i] * residual[i];
        return sum;
    }

    // Levenberg's method. In units of the model the Jacobian is the design itself; the covariance moves with
    // the model only through the calibration, which is settled after few steps.
    bool fit_linear() {
        if (!start_linear()) return false;
        double damping = 1e-3;
        for (int iteration = 0; iteration < 100; ++iteration) {
            if (is_lost() || !weigh()) return false;
            const Column scale = model_;
            Parameters step{};
            double before = 0;
            if (!solve(residual_of(theta_, scale), damping, step, before)) return false;
            Parameters next = theta_;
            double largest = 0;
            for (std::size_t k = 0; k < parameters_; ++k) {
                next[k] += step[k];
                largest = std::max(largest, std::abs(step[k]));
            }
            if (!(chi_square_of(next, scale) <= before + 1e-12 * (1 + before))) {
                damping = std::max(10 * damping, 1e-3);
                if (damping > 1e12) return false;
                continue;
            }
            theta_ = next;
            update_model();
            damping = damping < 1e-8 ? 0 : 0.1 * damping;
            if (largest < 1e-9 && damping < 1e-4) {
                if (!weigh()) return false;
                remove_bias();
                return true;
            }
        }
        return false;
    }

    // theta -> theta + M h/2 with h_i = X_i^T Cov X_i, all in units of the model (Box 1971).
    void remove_bias() {
        const Response response = make_response();
        const Small covariance = noise_covariance(response);
        Column h{};
        for (std::size_t i = 0; i < n_; ++i)
            h[i] = variance_of_log(covariance, i);
        for (std::size_t k = 0; k < parameters_; ++k)
            for (std::size_t i = 0; i < n_; ++i)
                theta_[k] += 0.5 * response[k][i] * h[i];
    }

    // M = (X^T C^-1 X)^-1 X^T C^-1, what a change of ln T_i does to the parameters.
    [[nodiscard]] Response make_response() const {
        Response response{};
        for (std::size_t k = 0; k < parameters_; ++k) {
            response[k] = weighted_[k];
            solve_upper(factor_, n_, response[k]);
        }
        for (std::size_t i = 0; i < n_; ++i) {
            Parameters column{};
            for (std::size_t k = 0; k < parameters_; ++k)
                column[k] = response[k][i];
            solve_lower(normal_factor_, parameters_, column);
            solve_upper(normal_factor_, parameters_, column);
            for (std::size_t k = 0; k < parameters_; ++k)
                response[k][i] = column[k];
        }
        return response;
    }

    [[nodiscard]] Small noise_covariance(const Response& response) const {
        Small out{};
        for (std::size_t k = 0; k < parameters_; ++k)
            for (std::size_t m = 0; m < parameters_; ++m)
                for (std::size_t i = 0; i < n_; ++i)
                    out[k][m] += response[k][i] * response[m][i] * noise_[i] / (model_[i] * model_[i]);
        return out;
    }

    [[nodiscard]] Small full_covariance(const Response& response) const {
        Small out{};
        for (std::size_t k = 0; k < parameters_; ++k)
            for (std::size_t m = 0; m < parameters_; ++m)
                for (std::size_t i = 0; i < n_; ++i)
                    for (std::size_t j = 0; j < n_; ++j)
                        out[k][m] += response[k][i] * response[m][j] *
                                     (i >= j ? covariance_[i][j] : covariance_[j][i]);
        return out;
    }

    [[nodiscard]] double variance_of_log(const Small& covariance, std::size_t i) const {
        double sum = 0;
        for (std::size_t k = 0; k < parameters_; ++k)
            for (std::size_t m = 0; m < parameters_; ++m)
                sum += design_[i][k] * covariance[k][m] * design_[i][m];
        return sum;
    }

    void write(IndexFit& out) const {
        const Response response = make_response();
        const Small noise = noise_covariance(response), full = full_covariance(response);
        for (std::size_t i = 0; i < n_; ++i)
            if (!(variance_of_log(full, i) <= largest_log_error * largest_log_error))
                out.verdict = IndexVerdict::Undecided;
        const Small& quoted = setup_.common_errors ? full : noise;
        // exp of an unbiased ln A is too large by half its variance.
        out.amplitude = std::exp(theta_[0] - 0.5 * noise[0][0]);
        out.amplitude_error = std::exp(theta_[0]) * std::sqrt(quoted[0][0]);
        out.index = theta_[1];
        out.index_error = std::sqrt(quoted[1][1]);
        if (!setup_.curvature) return;
        out.curvature = theta_[2];
        out.curvature_error = std::sqrt(quoted[2][2]);
    }

    const IndexFitSetup& setup_;
    std::size_t parameters_, n_ = 0;
    std::array<std::size_t, most_surveys> survey_{};
    Column data_{}, noise_{}, model_{};
    std::array<Parameters, most_surveys> design_{};
    Square covariance_{}, factor_{};
    Response weighted_{};  // L^-1 X
    Small normal_{}, normal_factor_{};
    Parameters theta_{};
};

}  // namespace

IndexFit fit_index(const IndexFitSetup& setup, std::span<const double> values,
                   std::span<const double> variances) {
    FOREGLOW_EXPECTS(values.size() == setup.log_ratios.size() && values.size() <= most_surveys &&
                     variances.size() == values.size() && setup.calibration_errors.size() == values.size() &&
                     setup.zero_level_covariance.rows == values.size());
    return PixelFit(setup, values, variances).run();
}

}  // namespace foreglow
