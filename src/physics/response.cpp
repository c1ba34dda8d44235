// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/response.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "base/constants.h"
#include "base/error.h"
#include "math/gauss_legendre.h"

namespace foreglow {
namespace {

// Pieces are cut where their ends differ by more than this ratio, which bounds the points that one piece
// needs.
constexpr double widest_ratio = 1.35;

// The integrand has its nearest singularity at nu = 0; n points leave rho^(-2n) with
// rho = (sqrt b + sqrt a)/(sqrt b - sqrt a) (Trefethen 2008, "Is Gauss quadrature better than
// Clenshaw-Curtis?", thm 4.5).
int points_for(double ratio) {
    const double root = std::sqrt(ratio);
    const double rho = (root + 1) / std::max(root - 1, 1e-300);
    const double wanted = 36.0 / (2 * std::log(rho)) + 1.0;
    return std::clamp(static_cast<int>(std::ceil(wanted)), 3, 12);
}

double weight_power(double hz, double scale, ResponseWeights weights) {
    const double x = hz / scale;
    switch (weights) {
        case ResponseWeights::Temperature:
            return 1.0;
        case ResponseWeights::Photon:
            return x;
        case ResponseWeights::Radiance:
            return x * x;
    }
    return 1.0;
}

// How far lambda^2 runs between two frequencies [m^2].
double lambda2_between(double low, double high) {
    const double c = constants::speed_of_light;
    return c * c * (1 / (low * low) - 1 / (high * high));
}

double calibration_temperature(const Calibration& calibration, double hz) {
    const Frequency frequency = Frequency::from_hz(hz);
    double t = rayleigh_jeans_per_unit(calibration.unit, frequency, calibration.pixel_area_sr);
    if (calibration.unit.kind == BrightnessUnit::Kind::MegajanskyPerSteradian ||
        calibration.unit.kind == BrightnessUnit::Kind::JanskyPerPixel)
        t *= std::pow(hz / calibration.reference.hz(), calibration.reference_flux_index);
    return t;
}

}  // namespace

Response Response::at(Frequency frequency) {
    FOREGLOW_EXPECTS(frequency.hz() > 0);
    return Response({{frequency, 1.0}});
}

Response Response::flat(Frequency low, Frequency high) {
    FOREGLOW_EXPECTS(low.hz() > 0 && low < high);
    return Response({{low, 1.0}, {high, 1.0}});
}

Response Response::table(std::vector<ResponseRow> rows) {
    FOREGLOW_EXPECTS(rows.size() >= 2 && rows.front().frequency.hz() > 0);
    bool passes = false;
    for (std::size_t i = 0; i < rows.size(); ++i) {
        FOREGLOW_EXPECTS(rows[i].transmission >= 0);
        if (i == 0) continue;
        FOREGLOW_EXPECTS(rows[i].frequency >= rows[i - 1].frequency);
        passes = passes || (rows[i].frequency > rows[i - 1].frequency &&
                            rows[i].transmission + rows[i - 1].transmission > 0);
    }
    FOREGLOW_EXPECTS(passes);
    return Response(std::move(rows));
}

std::vector<Response::Node> Response::nodes(ResponseWeights weights, const BandRefinement* refinement) const {
    if (is_delta()) return {{rows_.front().frequency.hz(), 1.0}};
    const double lambda2_step =
        refinement == nullptr
            ? std::numeric_limits<double>::infinity()
            : std::max(refinement->lambda2_step, lambda2_between(lowest().hz(), highest().hz()) /
                                                     static_cast<double>(refinement->most_nodes));
    std::vector<Node> all;
    const double scale = rows_.back().frequency.hz();
    for (std::size_t i = 1; i < rows_.size(); ++i) {
        const double low = rows_[i - 1].frequency.hz();
        const double high = rows_[i].frequency.hz();
        const double t_low = rows_[i - 1].transmission;
        const double t_high = rows_[i].transmission;
        if (!(high > low) || (t_low == 0 && t_high == 0)) continue;
        int cuts = std::max(1, static_cast<int>(std::ceil(std::log(high / low) / std::log(widest_ratio))));
        const QuadratureRule rule = make_gauss_legendre(points_for(std::pow(high / low, 1.0 / cuts)));
        const double wanted = lambda2_between(low, high) / lambda2_step;
        cuts = std::max(cuts, static_cast<int>(std::ceil(wanted / static_cast<double>(rule.nodes.size()))));
        const double step_ratio = std::pow(high / low, 1.0 / cuts);
        for (int cut = 0; cut < cuts; ++cut) {
            const double a = low * std::pow(step_ratio, cut);
            const double b = cut + 1 == cuts ? high : low * std::pow(step_ratio, cut + 1);
            for (std::size_t j = 0; j < rule.nodes.size(); ++j) {
                const double hz = 0.5 * ((a + b) + (b - a) * rule.nodes[j]);
                const double tau = t_low + (t_high - t_low) * ((hz - low) / (high - low));
                all.push_back(
                    {hz, 0.5 * (b - a) / scale * rule.weights[j] * tau * weight_power(hz, scale, weights)});
            }
        }
    }
    return all;
}

Frequency Response::mean_frequency(ResponseWeights weights) const {
    double sum = 0;
    double moment = 0;
    for (const Node& node : nodes(weights)) {
        sum += node.weight;
        moment += node.weight * node.hz;
    }
    return Frequency::from_hz(moment / sum);
}

BandSum make_band_sum(const Response& response, ResponseWeights weights, const Calibration& calibration,
                      const BandRefinement* refinement) {
    const auto nodes = response.nodes(weights, refinement);
    double denominator = 0;
    for (const auto& node : nodes)
        denominator += node.weight * calibration_temperature(calibration, node.hz);
    BandSum sum;
    for (const auto& node : nodes) {
        sum.hz.push_back(node.hz);
        sum.weights.push_back(node.weight / denominator);
    }
    return sum;
}

}  // namespace foreglow
