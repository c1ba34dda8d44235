// SPDX-License-Identifier: GPL-2.0-or-later
#include "physics/response.h"

#include <gtest/gtest.h>

#include <cmath>

#include "base/constants.h"
#include "base/error.h"

namespace foreglow {
namespace {

double band_value(const Response& response, ResponseWeights weights, const char* unit, Frequency reference,
                  double beta, double flux_index_of_source = 0) {
    const BandSum sum = make_band_sum(response, weights,
                                      {*find_brightness_unit(unit), reference, flux_index_of_source, 1e-4});
    double value = 0;
    for (std::size_t i = 0; i < sum.hz.size(); ++i)
        value += sum.weights[i] * std::pow(sum.hz[i] / reference.hz(), beta);
    return value;
}

struct BandCase {
    double low, high, reference;
    ResponseWeights weights;
    double k_rj, k_cmb, mjysr_iras, mjysr_flat;
};

// From outside: Planck 2013 IX conventions by mpmath and by scipy, T = 1 K_RJ at the reference, beta = -3.1,
// eleven digits.
constexpr BandCase cases[] = {
    {27, 33, 30, ResponseWeights::Radiance, 1.0005395177, 1.0244143863, 27.665588253, 27.758364175},
    {27, 33, 30, ResponseWeights::Temperature, 1.0215174103, 1.0455709553, 27.68410859, 27.96374605},
    {85, 115, 100, ResponseWeights::Radiance, 1.0012788735, 1.2987506207, 307.59733516, 309.93596886},
    {85, 115, 100, ResponseWeights::Temperature, 1.0493835389, 1.3511947992, 308.06307919, 315.1540452},
    {300, 400, 353, ResponseWeights::Radiance, 1.0279922245, 12.848815704, 3835.78863, 3895.3113077},
    {300, 400, 353, ResponseWeights::Temperature, 1.0726513027, 12.673890494, 3841.0519355, 3954.6830552},
    {0.39, 0.426, 0.408, ResponseWeights::Radiance, 1.0001014247, 1.0001057403, 0.0051148854898,
     0.0051182078516},
    {0.39, 0.426, 0.408, ResponseWeights::Temperature, 1.0041355698, 1.0041398917, 0.0051155497197,
     0.005125525873}};

TEST(Response, FlatBandsAgreeWithTheDefinitionsInEveryUnit) {
    constexpr double printed = 1e-10;  // of the table above
    for (const BandCase& one : cases) {
        const Response flat = Response::flat(Frequency::from_ghz(one.low), Frequency::from_ghz(one.high));
        const Frequency nu0 = Frequency::from_ghz(one.reference);
        EXPECT_NEAR(band_value(flat, one.weights, "K_RJ", nu0, -3.1) / one.k_rj, 1, printed);
        EXPECT_NEAR(band_value(flat, one.weights, "K_CMB", nu0, -3.1) / one.k_cmb, 1, printed);
        EXPECT_NEAR(band_value(flat, one.weights, "MJy/sr", nu0, -3.1, -1) / one.mjysr_iras, 1, printed);
        EXPECT_NEAR(band_value(flat, one.weights, "MJy/sr", nu0, -3.1, 0) / one.mjysr_flat, 1, printed);
    }
}

Response seven_rows() {
    std::vector<ResponseRow> rows;
    const double ghz[] = {25, 27, 28.5, 30, 32, 33.5, 36};
    const double tau[] = {0, .4, 1, .9, 1, .3, 0};
    for (int i = 0; i < 7; ++i)
        rows.push_back({Frequency::from_ghz(ghz[i]), tau[i]});
    return Response::table(rows);
}

// From outside: the same definitions for a table that is linear between rows, by mpmath; a trapezoid on the
// rows gives 0.979878640614 instead.
TEST(Response, TableIsLinearBetweenItsRows) {
    const Frequency nu0 = Frequency::from_ghz(30);
    EXPECT_NEAR(band_value(seven_rows(), ResponseWeights::Radiance, "K_RJ", nu0, -3.1), 0.979113831539,
                1e-11);
    EXPECT_NEAR(band_value(seven_rows(), ResponseWeights::Radiance, "K_CMB", nu0, -3.1), 1.00300735349,
                1e-10);
    EXPECT_NEAR(band_value(seven_rows(), ResponseWeights::Radiance, "MJy/sr", nu0, -3.1, -1), 27.6531966663,
                1e-9);
    EXPECT_NEAR(band_value(seven_rows(), ResponseWeights::Temperature, "K_RJ", nu0, -3.1), 1.01008850687,
                1e-10);
}

TEST(Response, ADeltaIsTheLimitOfANarrowBand) {
    const Frequency nu0 = Frequency::from_ghz(70);
    const Response narrow =
        Response::flat(Frequency::from_ghz(70 * (1 - 1e-6)), Frequency::from_ghz(70 * (1 + 1e-6)));
    for (const char* unit : {"K_RJ", "uK_CMB", "MJy/sr", "Jy/pixel"})
        for (const auto weights :
             {ResponseWeights::Temperature, ResponseWeights::Radiance, ResponseWeights::Photon}) {
            const double delta = band_value(Response::at(nu0), weights, unit, nu0, -2.9);
            EXPECT_NEAR(band_value(narrow, weights, unit, nu0, -2.9) / delta, 1,
                        1e-10);  // second order in a width of 1e-6
            EXPECT_NEAR(delta * rayleigh_jeans_per_unit(*find_brightness_unit(unit), nu0, 1e-4), 1, 1e-14);
        }
}

TEST(Response, StepsAndAWideBandAreIntegratedExactly) {
    // A box written with steps equals the flat band; 1 to 100 GHz of nu^-2 has the integral (1 - 1/100), mean
    // over 99 GHz.
    const auto ghz = [](double x) { return Frequency::from_ghz(x); };
    const Response steps = Response::table({{ghz(1), 0}, {ghz(1), 1}, {ghz(100), 1}, {ghz(100), 0}});
    const double expected = (1.0 - 0.01) / 99.0;
    EXPECT_NEAR(band_value(steps, ResponseWeights::Temperature, "K_RJ", ghz(1), -2) / expected, 1, 1e-13);
    EXPECT_NEAR(
        band_value(Response::flat(ghz(1), ghz(100)), ResponseWeights::Temperature, "K_RJ", ghz(1), -2) /
            expected,
        1, 1e-13);
}

TEST(Response, MeanFrequencyFollowsTheWeights) {
    const Response flat = Response::flat(Frequency::from_ghz(20), Frequency::from_ghz(40));
    EXPECT_NEAR(flat.mean_frequency(ResponseWeights::Temperature).ghz(), 30, 1e-12);
    // integral nu^2/integral nu = (2/3)(40^3 - 20^3)/(40^2 - 20^2)
    EXPECT_NEAR(flat.mean_frequency(ResponseWeights::Photon).ghz(), 2.0 / 3 * 56000 / 1200, 1e-12);
    EXPECT_NEAR(flat.mean_frequency(ResponseWeights::Radiance).ghz(), 0.75 * (2560000 - 160000) / 56000,
                1e-12);
}

TEST(Response, RefusesTablesThatPassNothing) {
    const auto ghz = [](double x) { return Frequency::from_ghz(x); };
    EXPECT_THROW(static_cast<void>(Response::table({{ghz(1), 0}, {ghz(2), 0}})), ContractError);
    EXPECT_THROW(static_cast<void>(Response::table({{ghz(2), 1}, {ghz(1), 1}})), ContractError);
    EXPECT_THROW(static_cast<void>(Response::table({{ghz(1), 1}, {ghz(1), 1}})), ContractError);
}

}  // namespace
}  // namespace foreglow
