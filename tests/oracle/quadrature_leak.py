#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Measures what one ring-weighted analysis leaves: the table of src/sphere/quadrature_leak.cpp, by healpy.

Gaussian skies with C_l = 1 in one band of l', nside/4 wide, up to 4 nside; the a_lm of one analysis with ring weights up to
lmax = 2 nside against those after twelve unweighted refinements. Prints log10 of the mean C_l of the difference, rows by band
of l, columns by band of l'.

Usage: quadrature_leak.py NSIDE SPIN     (64 0 and 64 2 made the table; a minute each)
"""

import sys
import warnings

import healpy
import numpy

BANDS, SKIES, REFINEMENTS = 8, 3, 12
warnings.simplefilter("ignore")


def analyse(maps, lmax, weighted):
    """Returns [a_lm] of I, or [E, B] of Q and U."""
    if len(maps) == 1:
        return [healpy.map2alm(maps[0], lmax=lmax, iter=0, use_weights=weighted)]
    if weighted:
        return list(healpy.map2alm([0 * maps[0], *maps], lmax=lmax, iter=0, use_weights=True)[1:])
    return list(healpy.map2alm_spin(maps, 2, lmax))


def synthesize(alms, nside, lmax):
    if len(alms) == 1:
        return [healpy.alm2map(alms[0], nside, lmax=lmax)]
    return list(healpy.alm2map_spin(alms, nside, 2, lmax))


def error_spectrum(maps, nside, lmax):
    first = analyse(maps, lmax, True)
    alms = [a.copy() for a in first]
    for _ in range(REFINEMENTS):
        rest = [m - s for m, s in zip(maps, synthesize(alms, nside, lmax))]
        alms = [a + c for a, c in zip(alms, analyse(rest, lmax, False))]
    return sum(healpy.alm2cl(a - b) for a, b in zip(first, alms))


def main(nside, spin):
    lmax, top = 2 * nside, 4 * nside
    columns = numpy.linspace(0, top, 2 * BANDS + 1).astype(int)
    rows = numpy.linspace(0, lmax, BANDS + 1).astype(int)
    columns[0] = rows[0] = 2
    table = numpy.zeros((BANDS, 2 * BANDS))
    for j in range(2 * BANDS):
        for sky in range(SKIES):
            numpy.random.seed(1000 + 10 * j + sky)
            cl = numpy.zeros(top + 1)
            cl[columns[j]:columns[j + 1]] = 1
            alm = healpy.synalm(cl, lmax=top)
            maps = synthesize([alm] if spin == 0 else [alm, 0 * alm], nside, top)
            error = error_spectrum(maps, nside, lmax)
            for i in range(BANDS):
                table[i, j] += numpy.mean(error[rows[i]:rows[i + 1]]) / SKIES
    for row in numpy.log10(table):
        print(", ".join(f"{x:.1f}" for x in row))


if __name__ == "__main__":
    main(int(sys.argv[1]), int(sys.argv[2]))
