// SPDX-License-Identifier: GPL-2.0-or-later
#include "sphere/harmonics.h"

#include <gtest/gtest.h>

#include "base/constants.h"
#include "base/error.h"
#include "reference.h"

namespace foreglow {
namespace {

using reference::closed_alm;
using reference::closed_alm_eb;
using reference::largest_difference;

// From outside: healpy 1.16 alm2map, nside 16, lmax 24, spin 0 and 2, sphere_reference.py.
TEST(Harmonics, SynthesisAgreesWithHealpy) {
    const auto table = reference::read_table("synthesis");
    const HealpixGrid grid(16);
    const auto i = synthesize(closed_alm(24, 0.0), grid);
    const auto qu = synthesize_spin2(closed_alm_eb(24), grid);
    for (std::size_t row = 0; row < table.at("pixel").size(); ++row) {
        const auto p = static_cast<std::size_t>(table.at("pixel")[row]);
        // both sum some 300 terms of order 0.3
        EXPECT_NEAR(i[p], table.at("i")[row], 1e-13);
        EXPECT_NEAR(qu.q[p], table.at("q")[row], 1e-13);
        EXPECT_NEAR(qu.u[p], table.at("u")[row], 1e-13);
    }
}

// From outside: healpy 1.16 map2alm with iter=0 and no weights.
TEST(Harmonics, PlainAnalysisAgreesWithHealpy) {
    const auto table = reference::read_table("analysis");
    const HealpixGrid grid(16);
    const auto maps = reference::rough_maps(grid);
    const Alm t = analyse(grid, maps.i, 32);
    const AlmEB eb = analyse_spin2(grid, maps.q, maps.u, 32);
    for (std::size_t row = 0; row < table.at("l").size(); ++row) {
        const int l = static_cast<int>(table.at("l")[row]), m = static_cast<int>(table.at("m")[row]);
        const auto expected = [&](const std::string& name) {
            return Alm::Value(table.at(name + "_re")[row], table.at(name + "_im")[row]);
        };
        EXPECT_LT(std::abs(t(l, m) - expected("t0")), 1e-13);  // rounding of a sum of order 10
        EXPECT_LT(std::abs(eb.e(l, m) - expected("e0")), 1e-13);
        EXPECT_LT(std::abs(eb.b(l, m) - expected("b0")), 1e-13);
    }
}

// From outside: the closed forms of Y_lm (Jackson, Classical Electrodynamics, 3.5) and std::sph_legendre.
TEST(Harmonics, SynthesisIsTheSumOfSphericalHarmonics) {
    const HealpixGrid grid(4);
    Alm one(3);
    one(0, 0) = 2.0;
    one(1, 0) = 3.0;
    one(3, 2) = {0.5, -0.25};
    const auto map = synthesize(one, grid);
    for (std::int64_t p = 0; p < grid.npix(); ++p) {
        const auto [x, y, z] = grid.direction(p);
        const double phi = std::atan2(y, x), pi = constants::pi;
        const double expected = 2.0 / std::sqrt(4 * pi) + 3.0 * std::sqrt(3 / (4 * pi)) * z +
                                2.0 * std::sph_legendre(3u, 2u, std::acos(z)) *
                                    (0.5 * std::cos(2 * phi) + 0.25 * std::sin(2 * phi));
        EXPECT_NEAR(map[static_cast<std::size_t>(p)], expected, 1e-14);
    }
}

TEST(Harmonics, AnalysisIsTheAdjointOfSynthesis) {
    const HealpixGrid grid(8);
    const int lmax = 20;
    const auto maps = reference::rough_maps(grid);
    const auto inner = [](const Alm& a, const Alm& b) {
        double sum = 0;
        for (int m = 0; m <= a.lmax(); ++m)
            for (int l = m; l <= a.lmax(); ++l)
                sum += (m == 0 ? 1.0 : 2.0) *
                       (a(l, m).real() * b(l, m).real() + a(l, m).imag() * b(l, m).imag());
        return sum;
    };
    const auto over_pixels = [&](std::span<const double> a, std::span<const double> b) {
        double sum = 0;
        for (std::size_t p = 0; p < a.size(); ++p)
            sum += a[p] * b[p];
        return sum * grid.pixel_area();
    };
    const Alm a = closed_alm(lmax, 0.0);
    // rounding of 768 products of order 10
    EXPECT_NEAR(over_pixels(synthesize(a, grid), maps.i), inner(a, analyse(grid, maps.i, lmax)), 1e-11);
    const AlmEB eb = closed_alm_eb(lmax);
    const auto qu = synthesize_spin2(eb, grid);
    const auto back = analyse_spin2(grid, maps.q, maps.u, lmax);
    EXPECT_NEAR(over_pixels(qu.q, maps.q) + over_pixels(qu.u, maps.u),
                inner(eb.e, back.e) + inner(eb.b, back.b), 1e-11);
}

TEST(Harmonics, StripsGiveTheWholeToRounding) {
    const HealpixGrid grid(32);
    const Alm a = closed_alm(64, 0.0);
    const AlmEB eb = closed_alm_eb(64);
    const auto whole = synthesize(a, grid);
    const auto whole_qu = synthesize_spin2(eb, grid);
    std::vector<RingStrip> strips = cut_into_strips(grid, 1500);
    EXPECT_GT(strips.size(), 5u);
    std::vector<double> seen(whole.size());
    Alm sum(64);
    AlmEB sum_eb{Alm(64), Alm(64)};
    for (auto it = strips.rbegin(); it != strips.rend(); ++it) {
        std::vector<double> i(static_cast<std::size_t>(pixel_count(grid, *it))), q(i.size()), u(i.size());
        synthesize_strip(a, grid, *it, i);
        synthesize_strip_spin2(eb, grid, *it, q, u);
        for (const auto& range : pixel_ranges(grid, *it))
            for (std::int64_t k = 0; k < range.count; ++k) {
                const auto p = static_cast<std::size_t>(range.first_pixel + k);
                const auto s = static_cast<std::size_t>(range.offset + k);
                ++seen[p];
                EXPECT_NEAR(i[s], whole[p], 1e-14);  // terms that underflow are cut in other groups of rings
                EXPECT_NEAR(q[s], whole_qu.q[p], 1e-14);
                EXPECT_NEAR(u[s], whole_qu.u[p], 1e-14);
            }
        add_analysis_of_strip(sum, grid, *it, i);
        add_analysis_of_strip_spin2(sum_eb, grid, *it, q, u);
    }
    EXPECT_EQ(seen, std::vector<double>(whole.size(), 1.0));
    EXPECT_LT(largest_difference(sum.values(), analyse(grid, whole, 64).values()), 1e-14);
    const auto whole_eb = analyse_spin2(grid, whole_qu.q, whole_qu.u, 64);
    EXPECT_LT(largest_difference(sum_eb.e.values(), whole_eb.e.values()), 1e-14);
    EXPECT_LT(largest_difference(sum_eb.b.values(), whole_eb.b.values()), 1e-14);
}

TEST(Harmonics, AnyContiguousRingsMakeAStrip) {
    const HealpixGrid grid(8);
    const Alm a = closed_alm(20, 0.0);
    const auto whole = synthesize(a, grid);
    for (const RingStrip strip : {RingStrip{3, 5, false}, RingStrip{10, 12, false}, RingStrip{30, 1, false},
                                  RingStrip{15, 1, true}, RingStrip{4, 12, true}}) {
        std::vector<double> part(static_cast<std::size_t>(pixel_count(grid, strip)));
        synthesize_strip(a, grid, strip, part);
        for (const auto& range : pixel_ranges(grid, strip))
            for (std::int64_t k = 0; k < range.count; ++k)
                EXPECT_NEAR(part[static_cast<std::size_t>(range.offset + k)],
                            whole[static_cast<std::size_t>(range.first_pixel + k)], 1e-14);
    }
    EXPECT_THROW((void)pixel_count(grid, {10, 12, true}), ContractError);
    EXPECT_THROW((void)pixel_count(grid, {30, 2, false}), ContractError);
}

TEST(Harmonics, LimitOfLIsThatOfCoefficientsCutThere) {
    const HealpixGrid grid(8);
    const auto limited = synthesize(closed_alm(24, 0.0), grid, 10);
    EXPECT_LT(largest_difference(limited, synthesize(with_lmax(closed_alm(24, 0.0), 10), grid)), 1e-14);
    const auto eb = closed_alm_eb(24);
    const auto cut = synthesize_spin2({with_lmax(eb.e, 10), with_lmax(eb.b, 10)}, grid);
    EXPECT_LT(largest_difference(synthesize_spin2(eb, grid, 10).q, cut.q), 1e-14);
    EXPECT_LT(largest_difference(synthesize_spin2(eb, grid, 10).u, cut.u), 1e-14);
}

TEST(Harmonics, ResultsDoNotDependOnThreads) {
    const HealpixGrid grid(64);
    const Alm a = closed_alm(128, 0.0);
    const AlmEB eb = closed_alm_eb(128);
    std::vector<double> first_map;
    StokesValues first_qu;
    Alm first_alm;
    AlmEB first_eb;
    for (const int threads : {1, 2, 4}) {
        const reference::Threads set(threads);
        const auto map = synthesize(a, grid);
        const auto qu = synthesize_spin2(eb, grid);
        const Alm alm = analyse(grid, map, 128);
        const AlmEB back = analyse_spin2(grid, qu.q, qu.u, 128);
        if (threads == 1) {
            first_map = map;
            first_qu = qu;
            first_alm = alm;
            first_eb = back;
        }
        EXPECT_EQ(map, first_map);
        EXPECT_EQ(qu.q, first_qu.q);
        EXPECT_EQ(qu.u, first_qu.u);
        EXPECT_EQ(alm, first_alm);
        EXPECT_EQ(back, first_eb);
    }
}

TEST(Harmonics, RefusesAnUndefinedPixelAndAWrongLength) {
    const HealpixGrid grid(4);
    std::vector<double> map(192, 1.0), zero(192);
    map[100] = std::nan("");
    EXPECT_THROW((void)analyse(grid, map, 8), ContractError);
    EXPECT_THROW((void)analyse_spin2(grid, map, zero, 8), ContractError);
    EXPECT_THROW((void)analyse_spin2(grid, zero, map, 8), ContractError);
    map.pop_back();
    EXPECT_THROW((void)analyse(grid, map, 8), ContractError);
}

TEST(Harmonics, TooFewTermsForSpinTwoAreZero) {
    const HealpixGrid grid(2);
    const auto qu = synthesize_spin2({Alm(1), Alm(1)}, grid);
    EXPECT_EQ(qu.q, std::vector<double>(48, 0.0));
    EXPECT_EQ(analyse_spin2(grid, qu.q, qu.u, 1).e.lmax(), 1);
}

}  // namespace
}  // namespace foreglow
