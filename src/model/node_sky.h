// SPDX-License-Identifier: GPL-2.0-or-later
#pragma once

#include <cstddef>
#include <functional>
#include <span>
#include <vector>

#include "base/quantity.h"
#include "model/spectral_basis.h"
#include "physics/response.h"

namespace foreglow {

/// Interpolates spectra between a few node frequencies: a polynomial in ln nu of the ratio to a common
/// spectrum, by the barycentric formula (Berrut & Trefethen 2004).
struct NodeInterpolation {
    std::vector<double> log_hz;                  ///< [K], ascending
    std::vector<double> log_common;              ///< ln of the common spectrum at the nodes, [K]
    std::function<double(double)> log_spectrum;  ///< of ln nu

    /// Makes nodes with the common spectrum's values at them.
    NodeInterpolation(std::vector<double> log_hz, std::function<double(double)> log_spectrum);

    /// Returns the weights of the nodes' values for a band.
    [[nodiscard]] std::vector<double> weights(const BandSum& band) const;
};

/// Returns K Chebyshev points in [low, high], ascending.
[[nodiscard]] std::vector<double> make_chebyshev_points(double low, double high, int count);

/// A sky that is no amplitude times a law but maps at node frequencies, made by an integrator.
///
/// Intensity in a band is a weighted sum of its nodes' maps. So are Q and U, unless they turn too much over
/// the bands: then each channel's own average was made where the integrator was.
struct NodeSky {
    NodeInterpolation nodes;
    std::vector<std::vector<double>> i;     ///< K_RJ, [K][npix]
    std::vector<std::vector<double>> q, u;  ///< K_RJ, COSMO, [K][npix]; empty where made band by band
    std::vector<BandSum> bands;             ///< [channels], where Q and U were made band by band ...
    std::vector<std::vector<double>> band_q, band_u;  ///< ... in their units, [channels][npix]

    /// Spectra of some pixels at so many nodes that they stand for the exact ones.
    struct Sample {
        NodeInterpolation nodes;
        Matrix i, q, u;  ///< [pixels][nodes]
    };
    Sample sample;
    double sampling_error = 0;  ///< largest relative error of the line-of-sight integral
};

/// Makes the bases of a node sky: components are the nodes, or the channels where Q and U are theirs.
[[nodiscard]] SpectralBasis make_node_basis(const NodeSky& sky, std::span<const BandSum> channels);
[[nodiscard]] SpectralBasis make_polarized_node_basis(const NodeSky& sky, std::span<const BandSum> channels);

/// Returns the place of a component, made by the functions above, among the sky's maps.
[[nodiscard]] std::size_t place_of_component(const NodeSky& sky, const BandSum& component, bool polarized);

/// The error that interpolation between nodes leaves of each channel, from the sampled pixels.
struct NodeErrors {
    std::vector<double> rms;    ///< over the pixels, the larger of I and (Q, U), relative to the rms
    std::vector<double> worst;  ///< of a pixel: of I, and of (Q, U) over the larger of P and its rms
};
[[nodiscard]] NodeErrors measure_node_errors(const NodeSky& sky, std::span<const BandSum> channels,
                                             bool polarized);

}  // namespace foreglow
