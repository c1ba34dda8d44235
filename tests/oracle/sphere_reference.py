#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Writes the tables sphere_*.csv that tests/unit/sphere compares with: values of healpy, astropy and numpy.

Run it from any folder; the tables land beside this file. The inputs are closed formulas that the tests repeat.
"""
import os

import astropy.units as u
import healpy as hp
import numpy as np
from astropy.coordinates import BarycentricMeanEcliptic, SkyCoord

HERE = os.path.dirname(os.path.abspath(__file__))
NSIDE, LMAX = 16, 24


def write(name, header, rows):
    with open(os.path.join(HERE, f"sphere_{name}.csv"), "w") as out:
        out.write(header + "\n")
        for row in rows:
            out.write(",".join(repr(v.item() if hasattr(v, "item") else v) for v in row) + "\n")


def closed_alm(lmax, shift):
    l, m = hp.Alm.getlm(lmax)
    size = (l + 1.0) ** -1.5
    alm = size * np.cos(3.0 * l + 5.0 * m + shift) + 1j * np.where(m > 0, size * np.sin(2.0 * l + 7.0 * m + shift), 0)
    return alm


def spin2_alm(lmax, shift):
    l, _ = hp.Alm.getlm(lmax)
    return np.where(l >= 2, closed_alm(lmax, shift), 0)


def grid():
    rng = np.random.default_rng(1)
    rows = []
    for nside in (1, 2, 8, 512, 8192):
        for pixel in sorted({0, 12 * nside**2 - 1, *rng.integers(0, 12 * nside**2, 8).tolist()}):
            x, y, z = hp.pix2vec(nside, pixel)
            theta, phi = np.arccos(rng.uniform(-1, 1)), rng.uniform(0, 2 * np.pi)
            pix, w = hp.get_interp_weights(nside, theta, phi)
            neighbours = hp.get_all_neighbours(nside, pixel)
            rows.append([nside, pixel, x, y, z, hp.ring2nest(nside, pixel), theta, phi, *pix, *w, *neighbours])
    head = "nside,pixel,x,y,z,nested,theta,phi,p0,p1,p2,p3,w0,w1,w2,w3,n0,n1,n2,n3,n4,n5,n6,n7"
    write("grid", head, rows)


def frames():
    rng = np.random.default_rng(2)
    rows = []
    for lon, lat in [(0, 90), (0, 0), *zip(rng.uniform(0, 360, 8), rng.uniform(-90, 90, 8))]:
        c = SkyCoord(lon * u.deg, lat * u.deg, frame="icrs")
        e = c.transform_to(BarycentricMeanEcliptic(equinox="J2000"))
        rows.append([float(lon), float(lat), c.galactic.l.deg, c.galactic.b.deg, e.lon.deg, e.lat.deg])
    write("frames", "ra,dec,l,b,ecliptic_lon,ecliptic_lat", rows)


def synthesis():
    # an array, since a list would be turned in place
    teb = np.array([closed_alm(LMAX, 0.0), spin2_alm(LMAX, 1.0), spin2_alm(LMAX, 2.0)])
    npix = hp.nside2npix(NSIDE)
    columns = [np.arange(0, npix, 41)]
    columns += [m[::41] for m in hp.alm2map(teb, NSIDE, lmax=LMAX, pol=True)]
    for coord in (["G", "C"], ["C", "G"], ["G", "E"], ["E", "G"]):
        turned = hp.Rotator(coord=coord).rotate_alm(teb)
        columns += [m[::41] for m in hp.alm2map(turned, NSIDE, lmax=LMAX, pol=True)]
    names = ["pixel", "i", "q", "u"] + [f"{s}_{c}" for c in ("gc", "cg", "ge", "eg") for s in "iqu"]
    write("synthesis", ",".join(names), zip(*columns))


def rough_maps():
    x, y, z = hp.pix2vec(NSIDE, np.arange(hp.nside2npix(NSIDE)))
    return (np.exp(2 * x + y) + 3 * np.abs(z), np.cos(3 * x) * (1 - z * z) + 0.2 * y, np.sin(2 * y) * z * (1 - z * z))


def analysis():
    """Not band-limited, and with many iterations: what the usual routine converges to."""
    maps = rough_maps()
    t, e, b = hp.map2alm(maps, lmax=2 * NSIDE, iter=30, pol=True)
    once = hp.map2alm(maps, lmax=2 * NSIDE, iter=0, pol=True)
    l, m = hp.Alm.getlm(2 * NSIDE)
    keep = np.arange(0, len(l), 7)
    columns = [l[keep], m[keep]]
    for a in (t, e, b, *once):
        columns += [a[keep].real, a[keep].imag]
    names = [f"{a}_{p}" for a in ("t", "e", "b", "t0", "e0", "b0") for p in ("re", "im")]
    write("analysis", "l,m," + ",".join(names), zip(*columns))


def beams():
    lmax = 128
    fwhm = np.radians(1.0)
    gauss = hp.gauss_beam(fwhm, lmax=lmax, pol=True)
    window_t, window_p = hp.pixwin(64, pol=True, lmax=lmax)
    write("beams", "l,gauss_t,gauss_e,pixel_t,pixel_p",
          zip(range(lmax + 1), gauss[:, 0], gauss[:, 1], window_t, window_p))


def spectra():
    a, b = closed_alm(LMAX, 0.0), closed_alm(LMAX, 1.0)
    write("spectra", "l,aa,ab", zip(range(LMAX + 1), hp.alm2cl(a), hp.alm2cl(a, b)))


def maps():
    """Interpolation of a map, and its means on a coarser grid with pixels left out."""
    values = rough_maps()[0]
    rng = np.random.default_rng(3)
    theta, phi = np.arccos(rng.uniform(-1, 1, 40)), rng.uniform(0, 2 * np.pi, 40)
    write("interpolation", "theta,phi,value", zip(theta, phi, hp.get_interp_val(values, theta, phi)))
    holed = values.copy()
    holed[::5] = hp.UNSEEN
    holed[:60] = hp.UNSEEN
    coarse = hp.ud_grade(holed, 4)
    write("degrade", "pixel,value", ((p, v if v != hp.UNSEEN else float("nan")) for p, v in enumerate(coarse)))


if __name__ == "__main__":
    for make in (grid, frames, synthesis, analysis, beams, spectra, maps):
        make()
