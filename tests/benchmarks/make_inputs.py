#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Makes the invented sky and the studies that the benchmarks run.

The sky is no measurement: a bright plane times lognormal structure, Q and U at a tenth of it, a spectral index near -2.8 and
a curvature near -0.05, all limited to l = 2 nside. By itself: make_inputs.py FOLDER [NSIDE [CHANNELS]].
"""

import sys
import warnings
from pathlib import Path

import healpy
import numpy

MODEL = """title = "Invented sky of the benchmarks"
reference_frequency = "23 GHz"
[intensity]
map = "sky{nside}.fits"
beam_fwhm = "10 arcmin"
[polarization]
map = "sky{nside}.fits"
columns = [2, 3]
polarization_convention = "COSMO"
[index]
map = "index{nside}.fits"
[curvature]
map = "curvature{nside}.fits"
"""


def random_alm(nside, slope, rms, random, first=1):
    """Returns the a_lm of a Gaussian random field of that rms with C_l ~ (l + 10)^-slope, l = first .. 2 nside."""
    lmax = 2 * nside
    ell = numpy.arange(lmax + 1)
    spectrum = (ell + 10.0) ** -slope * (ell >= first)
    spectrum *= 4 * numpy.pi * rms ** 2 / numpy.sum((2 * ell + 1) * spectrum)
    size = healpy.Alm.getsize(lmax)
    alm = (random.standard_normal(size) + 1j * random.standard_normal(size)) / numpy.sqrt(2)
    alm[:lmax + 1] = alm[:lmax + 1].real * numpy.sqrt(2)
    return healpy.almxfl(alm, numpy.sqrt(spectrum))


def random_field(nside, slope, rms, random):
    """Returns the map of random_alm."""
    return healpy.alm2map(random_alm(nside, slope, rms, random), nside, lmax=2 * nside)


def random_stokes(nside, slope, rms, random):
    """Returns Q and U of random E and B of that rms each, so that they are regular at the poles."""
    alms = [random_alm(nside, slope, rms, random, first=2) for _ in "EB"]
    return healpy.alm2map_spin(alms, nside, 2, 2 * nside)


def make_model(folder, nside):
    """Writes the model of one nside, with its maps in float32; returns the model's name."""
    folder = Path(folder)
    name = f"model{nside}.toml"
    if (folder / name).exists():
        return name
    random = numpy.random.default_rng(nside)
    theta, _ = healpy.pix2ang(nside, numpy.arange(healpy.nside2npix(nside)))
    plane = numpy.exp(-numpy.abs(90 - numpy.degrees(theta)) / 10)
    intensity = (10 + 20 * plane) * numpy.exp(random_field(nside, 2.6, 0.3, random))
    polarization = [0.1 * intensity * stokes for stokes in random_stokes(nside, 2.6, 0.7, random)]
    index = -2.8 + random_field(nside, 3, 0.1, random)
    curvature = -0.05 + random_field(nside, 3, 0.02, random)
    for file, maps, unit in (("sky", [intensity, *polarization], "K_RJ"), ("index", [index], ""),
                             ("curvature", [curvature], "")):
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            healpy.write_map(folder / f"{file}{nside}.fits", maps, coord="G", column_units=unit or None,
                             dtype=numpy.float32, overwrite=True)
    (folder / name).write_text(MODEL.format(nside=nside))
    return name


def make_study(folder, nside, channels, beams=False, low=20.0, high=350.0, stokes="IQU", beam_scale=60.0):
    """Writes a study of 25 % bands, log-spaced from low to high GHz, in uK_CMB; returns its path.

    With beams, FWHM = beam_scale arcmin * 30 GHz/nu and accuracy = 1e-4, about what one analysis with ring weights leaves in
    the narrowest of them: no side has to refine.
    """
    folder = Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    lines = [f'model = "{make_model(folder, nside)}"', f"nside = {nside}", f'stokes = "{stokes}"', 'unit = "uK_CMB"',
             f"lmax = {2 * nside}", "truth = false"]
    if beams:
        lines.append("accuracy = 1e-4")
    for number in range(channels):
        ghz = low * (high / low) ** (number / max(channels - 1, 1))
        lines += ["[[channel]]", f'name = "c{number:04d}"', f'frequency = "{ghz:.6f} GHz"',
                  f'bandwidth = "{ghz / 4:.6f} GHz"']
        if beams:
            lines.append(f'beam_fwhm = "{beam_scale * 30 / ghz:.5f} arcmin"')
    path = folder / f"{'beams' if beams else 'plain'}{nside}-{channels}{'' if stokes == 'IQU' else stokes}.toml"
    path.write_text("\n".join(lines) + "\n")
    return path


if __name__ == "__main__":
    if len(sys.argv) < 2:
        sys.exit(__doc__)
    grid, count = (int(a) for a in (sys.argv[2:] + ["512", "40"][len(sys.argv) - 2:]))
    for with_beams in (False, True):
        print(make_study(sys.argv[1], grid, count, with_beams))
