#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Makes a study's maps as a careful person would with numpy and healpy: the yardstick of the benchmarks.

All that this kind of script can easily save is saved: templates are read once, arithmetic is in float32 and in blocks that
stay in cache, a band is one polynomial of degree 2 in (index, curvature) and one exponential a pixel, shared by I, Q and U;
transforms use ring weights, no iterations and the study's lmax (2 nside unless it says otherwise). Errors: 5e-5 of the bands,
1e-5 or less of the transforms, where beams are 1/nu. Threads: those of healpy's own OpenMP.

Usage: careful_study.py STUDY.toml OUT [EVERY]     with EVERY = n only each n-th channel.
Prints JSON, a list of [seconds, CPU seconds] of the reading and then of each channel; starting Python and importing are left out.
"""

import json
import sys
import time
import tomllib
import warnings
from pathlib import Path

import healpy
import numpy

H_OVER_K_T = 6.62607015e-34 / (1.380649e-23 * 2.7255)  # CODATA 2018, T_CMB of Fixsen 2009
BLOCK = 1 << 15  # pixels: five float32 arrays of it fit a second-level cache
warnings.simplefilter("ignore")


def both_clocks():
    return time.perf_counter(), time.process_time()


def number(text):
    return float(text.split()[0])


def band_nodes(channel):
    """Returns nu [GHz] and weights so that M [uK_CMB] = sum of weights T_RJ(nu) [K]: a flat response to temperature."""
    nu = numpy.array([number(channel["frequency"])])
    weights = numpy.ones(1)
    if "bandwidth" in channel:
        x, weights = numpy.polynomial.legendre.leggauss(16)
        nu = nu + number(channel["bandwidth"]) / 2 * x
    x = H_OVER_K_T * nu * 1e9
    return nu, weights * 1e6 / numpy.sum(weights * (x / 2 / numpy.sinh(x / 2)) ** 2)


def fit_band(channel, reference, index, curvature):
    """Returns k of ln M = k0 + b (k1 + k2 b + k3 c) + c (k4 + k5 c), fitted over the ranges of b (index) and c (curvature)."""
    nu, weights = band_nodes(channel)
    lg = numpy.log(nu / reference)
    b, c = (a.ravel() for a in numpy.meshgrid(numpy.linspace(*index, 9), numpy.linspace(*curvature, 9)))
    value = numpy.log(numpy.exp(lg * (b[:, None] + c[:, None] * lg)) @ weights)
    powers = numpy.stack([numpy.ones_like(b), b, b * b, b * c, c, c * c], axis=1)
    return numpy.linalg.lstsq(powers, value, rcond=None)[0].astype(numpy.float32)


def apply_band(k, sky, index, curvature, out):
    """Writes the channel's maps before its beam: out [3][npix] = sky exp(polynomial)."""
    t, s = numpy.empty((2, BLOCK), numpy.float32)
    for begin in range(0, len(index), BLOCK):
        part = slice(begin, min(begin + BLOCK, len(index)))
        b, c = index[part], curvature[part]
        f, g = t[:len(b)], s[:len(b)]
        numpy.multiply(b, k[2], out=f)
        numpy.multiply(c, k[3], out=g)
        f += g
        f += k[1]
        f *= b
        numpy.multiply(c, k[5], out=g)
        g += k[4]
        g *= c
        f += g
        f += k[0]
        numpy.exp(f, out=f)
        numpy.multiply(sky[:, part], f, out=out[:, part])


def smooth(maps, fwhm_arcmin, nside, lmax):
    """Returns the maps through a Gaussian beam."""
    alms = healpy.map2alm(maps, lmax=lmax, iter=0, use_weights=True, pol=True)
    beam = healpy.gauss_beam(numpy.radians(fwhm_arcmin / 60), lmax=lmax, pol=True)
    for which in range(3):
        healpy.almxfl(alms[which], beam[:, which], inplace=True)
    return healpy.alm2map(alms, nside, lmax=lmax, pol=True)


def main(study_path, out_folder, every=1):
    clocks = [both_clocks()]
    folder, out_folder = Path(study_path).parent, Path(out_folder)
    study = tomllib.loads(Path(study_path).read_text())
    model = tomllib.loads((folder / study["model"]).read_text())
    nside, lmax = study["nside"], study.get("lmax", 2 * study["nside"])
    sky = numpy.array(healpy.read_map(folder / model["intensity"]["map"], field=(0, 1, 2), dtype=numpy.float32))
    index = healpy.read_map(folder / model["index"]["map"], dtype=numpy.float32)
    curvature = healpy.read_map(folder / model["curvature"]["map"], dtype=numpy.float32)
    ranges = [(a.min(), a.max()) for a in (index, curvature)]
    out = numpy.empty_like(sky)
    out_folder.mkdir(parents=True, exist_ok=True)
    clocks.append(both_clocks())
    for channel in study["channel"][::every]:
        k = fit_band(channel, number(model["reference_frequency"]), *ranges)
        apply_band(k, sky, index, curvature, out)
        maps = smooth(out, number(channel["beam_fwhm"]), nside, lmax) if "beam_fwhm" in channel else out
        healpy.write_map(out_folder / f"{channel['name']}.fits", maps, dtype=numpy.float32, coord="G",
                         column_units=study["unit"], overwrite=True)
        clocks.append(both_clocks())
    print(json.dumps(numpy.diff(clocks, axis=0).tolist()))


if __name__ == "__main__":
    main(sys.argv[1], sys.argv[2], int(sys.argv[3]) if len(sys.argv) > 3 else 1)
