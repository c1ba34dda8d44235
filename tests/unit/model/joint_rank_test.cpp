// SPDX-License-Identifier: GPL-2.0-or-later
#include "model/joint_rank.h"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

#include "base/random.h"
#include "sphere/beam.h"
#include "sphere/gaussian_field.h"
#include "sphere/power_spectrum.h"

namespace foreglow {
namespace {

constexpr int lmax = 96;
constexpr std::size_t component_count = 5;

/// Components that are nearly the same sky, as those of one spectral law are.
std::vector<Alm> similar_skies(std::uint32_t field) {
    std::vector<double> cl(lmax + 1);
    for (std::size_t l = 1; l < cl.size(); ++l)
        cl[l] = std::pow(static_cast<double>(l), -2.6);
    const Alm base = make_gaussian_alm(cl, lmax, {1, 0, field});
    std::vector<Alm> skies;
    for (std::uint32_t k = 0; k < component_count; ++k) {
        Alm sky = base;
        add_scaled(sky, 0.1, make_gaussian_alm(cl, lmax, {1, 0, field + 1 + k}));
        skies.push_back(sky);
    }
    return skies;
}

struct Study {
    Matrix weights;
    std::vector<std::vector<double>> windows;
};

/// Channels whose weights vary smoothly, with beams falling along them, in units that differ by a factor of
/// 1e6.
Study smooth_study(std::size_t channels) {
    Study study;
    study.weights = Matrix(channels, component_count);
    for (std::size_t c = 0; c < channels; ++c) {
        const double x = -1 + 2 * static_cast<double>(c) / static_cast<double>(channels - 1);
        for (std::size_t k = 0; k < component_count; ++k)
            study.weights(c, k) = std::pow(x, static_cast<double>(k)) * std::pow(1e3, x);
        study.windows.push_back(make_gaussian_beam(Angle::from_degrees(4 - 2 * x), lmax).temperature);
    }
    return study;
}

Alm channel_alm(const std::vector<Alm>& components, const Study& study, std::size_t channel) {
    Alm sum(lmax);
    for (std::size_t k = 0; k < components.size(); ++k)
        add_scaled(sum, study.weights(channel, k), components[k]);
    multiply_by_l(sum, study.windows[channel]);
    return sum;
}

// The oracle: the combination carried out on the a_lm themselves.
double true_error(const std::vector<Alm>& components, const Study& study, const JointRank& rank,
                  std::size_t channel) {
    const Alm exact = channel_alm(components, study, channel);
    Alm rest = exact;
    for (std::size_t r = 0; r < rank.skeletons.size(); ++r)
        add_scaled(rest, -rank.coefficients(channel, r), channel_alm(components, study, rank.skeletons[r]));
    return rms_of_spectrum(power_spectrum(rest), {}, 0) / rms_of_spectrum(power_spectrum(exact));
}

TEST(JointRank, KeepsItsToleranceWithFewSkeletonsAndKnowsItsError) {
    const auto components = similar_skies(10);
    const Study study = smooth_study(60);
    std::size_t before = 0;
    for (const double tolerance : {1e-3, 1e-5, 1e-7}) {
        const JointRank rank =
            make_joint_rank(component_spectra(components), study.weights, study.windows, tolerance);
        ASSERT_FALSE(rank.is_plain);
        EXPECT_LT(rank.skeletons.size(), 25U);
        EXPECT_GT(rank.skeletons.size(), before);  // more is asked, more is needed
        before = rank.skeletons.size();
        EXPECT_LT(rank.largest_sum, 20);  // the pivots keep the combination well conditioned
        for (std::size_t c = 0; c < 60; ++c) {
            const double error = true_error(components, study, rank, c);
            EXPECT_LE(error, 1.001 * tolerance + 1e-13);
            // Computed from spectra instead of a_lm: the same sum but for its rounding, 1e-16 of the squares'
            // cancellation.
            EXPECT_NEAR(rank.errors[c], error, 1e-3 * error + 3e-8);
        }
    }
}

TEST(JointRank, SumsThePowerOfEAndB) {
    const auto e = similar_skies(30), b = similar_skies(40);
    std::vector<AlmEB> both;
    for (std::size_t k = 0; k < component_count; ++k)
        both.push_back({e[k], b[k]});
    const auto spectra = component_spectra(both);
    for (const int l : {2, 17, lmax}) {
        const double expected = (2 * l + 1) * (cross_spectrum(e[1], e[3])[static_cast<std::size_t>(l)] +
                                               cross_spectrum(b[1], b[3])[static_cast<std::size_t>(l)]);
        EXPECT_NEAR(spectra[static_cast<std::size_t>(l)](3, 1) / expected, 1,
                    1e-12);  // a sum of 200 products
        EXPECT_EQ(spectra[static_cast<std::size_t>(l)](3, 1), spectra[static_cast<std::size_t>(l)](1, 3));
    }
}

TEST(JointRank, IsPlainWhereNothingIsSaved) {
    const auto spectra = component_spectra(similar_skies(50));
    const Study two = smooth_study(2);
    EXPECT_TRUE(make_joint_rank(spectra, two.weights, two.windows, 1e-3).is_plain);
    Study unrelated = smooth_study(12);
    for (std::size_t c = 0; c < 12; ++c)
        for (std::size_t l = 0; l < unrelated.windows[c].size(); ++l)
            unrelated.windows[c][l] =
                0.5 + 0.5 *
                          static_cast<double>(random_words({7, 0, 0}, static_cast<std::uint32_t>(l),
                                                           static_cast<std::uint32_t>(c))[0]) *
                          0x1p-32;
    const JointRank rank = make_joint_rank(spectra, unrelated.weights, unrelated.windows, 1e-6);
    EXPECT_TRUE(rank.is_plain);
    EXPECT_EQ(rank.skeletons.size(), 12U);
    EXPECT_EQ(*std::max_element(rank.errors.begin(), rank.errors.end()), 0.0);
}

TEST(JointRank, LeavesAnEmptyChannelEmpty) {
    const auto components = similar_skies(60);
    Study study = smooth_study(20);
    for (std::size_t k = 0; k < component_count; ++k)
        study.weights(4, k) = 0;
    const JointRank rank = make_joint_rank(component_spectra(components), study.weights, study.windows, 1e-4);
    ASSERT_FALSE(rank.is_plain);
    for (std::size_t r = 0; r < rank.skeletons.size(); ++r)
        EXPECT_EQ(rank.coefficients(4, r), 0.0);
    EXPECT_EQ(rank.errors[4], 0.0);
}

}  // namespace
}  // namespace foreglow
