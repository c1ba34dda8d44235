# SPDX-License-Identifier: GPL-2.0-or-later
"""What the end-to-end tests share: a scratch folder, the built command, maps in and out, and how errors are measured."""

import os
import shutil
import subprocess
import sys
import tempfile
import unittest
from pathlib import Path

os.environ.setdefault("OMP_NUM_THREADS", "1")  # of healpy: tests run side by side; must be set before it is imported

import healpy
import numpy
from astropy.io import fits

sys.path.insert(0, str(Path(__file__).resolve().parent.parent / "oracle"))
FOREGLOW = None  # set by main()
NAMES = ["I_STOKES", "Q_STOKES", "U_STOKES"]


def main():
    """Runs the tests of the calling file; the first argument is the command to test."""
    global FOREGLOW
    module = sys.modules["__main__"]
    sys.modules["harness"].FOREGLOW = str(Path(sys.argv.pop(1)).resolve())
    unittest.main(module=module, verbosity=2)


class Case(unittest.TestCase):
    """Gives each test a scratch folder of its own and calls of the command in it."""

    def setUp(self):
        self.folder = Path(tempfile.mkdtemp(prefix="foreglow "))  # the blank is on purpose
        self.addCleanup(shutil.rmtree, self.folder)

    def foreglow(self, *arguments, status=0, environment=None):
        """Runs the command in the scratch folder and returns what it printed, once its exit status is as expected."""
        done = subprocess.run([sys.modules["harness"].FOREGLOW, *map(str, arguments)], cwd=self.folder, text=True,
                              capture_output=True, stdin=subprocess.DEVNULL, env=command_environment(environment))
        self.assertEqual(done.returncode, status, f"{arguments}\n{done.stdout}\n{done.stderr}")
        return done

    def write(self, name, text):
        path = self.folder / name
        path.write_text(text)
        return path

    def write_map(self, name, columns, unit=None, frame="G", convention=None, nested=False, dtype=">f8",
                  names=None, pixels=None):
        """Writes RING columns as a HEALPix table by astropy alone; pixels makes it an explicit partial-sky file."""
        columns = numpy.atleast_2d(columns)
        nside = healpy.npix2nside(columns.shape[1])
        if nested:
            columns = [healpy.reorder(c, r2n=True) for c in columns]
        fields = []
        if pixels is not None:
            fields.append(fits.Column("PIXEL", "J", array=numpy.asarray(pixels)))
            columns = [c[pixels] for c in columns]
        code = {">f8": "D", ">f4": "E"}[dtype]
        for number, column in enumerate(columns):
            fields.append(fits.Column((names or NAMES)[number], code, array=column.astype(dtype), unit=unit))
        table = fits.BinTableHDU.from_columns(fields)
        table.header.update({"PIXTYPE": "HEALPIX", "NSIDE": nside, "ORDERING": "NESTED" if nested else "RING",
                             "INDXSCHM": "IMPLICIT" if pixels is None else "EXPLICIT"})
        if frame:
            table.header["COORDSYS"] = frame
        if convention:
            table.header["POLCCONV"] = convention
        path = self.folder / name
        table.writeto(path, overwrite=True)
        return path


CACHE = tempfile.TemporaryDirectory(prefix="foreglow-cache-")  # of this test alone; removed with it


def command_environment(more=None):
    """Returns the environment of the command: its own choice of threads, which do not spin while others need the processors."""
    environment = {**os.environ, "OMP_WAIT_POLICY": "passive", "XDG_CACHE_HOME": CACHE.name, **(more or {})}
    del environment["OMP_NUM_THREADS"]
    return environment


def read_maps(path):
    """Returns the map's columns as RING arrays [ncol][npix] with NaN where undefined, and the header."""
    with fits.open(path) as file:
        header = file[1].header
        columns = [n for n in file[1].columns.names if n != "PIXEL"]
        values = [numpy.asarray(file[1].data[n], float).ravel() for n in columns]
        if header["INDXSCHM"].strip() == "EXPLICIT":
            pixels = numpy.asarray(file[1].data["PIXEL"], int).ravel()
            full = numpy.full((len(values), healpy.nside2npix(header["NSIDE"])), numpy.nan)
            full[:, pixels] = values
            values = list(full)
    values = [numpy.where(numpy.isclose(v, healpy.UNSEEN, rtol=1e-5), numpy.nan, v) for v in values]
    if header["ORDERING"].strip() == "NESTED":
        values = [healpy.reorder(v, n2r=True) for v in values]
    return numpy.array(values), header


def pixel_error(maps, expected):
    """Returns the worst relative error of a pixel: of I, and of Q and U against P."""
    worst = numpy.max(numpy.abs(maps[0] / expected[0] - 1))
    if len(expected) == 3:
        strength = numpy.hypot(expected[1], expected[2])
        worst = max(worst, numpy.max(numpy.abs(maps[1:] - expected[1:]) / strength))
    return worst


def map_error(maps, expected):
    """Returns rms(error)/rms(map) of I without monopole and dipole, and of (Q, U) where there are."""
    def without_dipole(m):
        return healpy.remove_dipole(m, copy=True)

    def rms(values):
        return numpy.sqrt(numpy.mean(numpy.square(values)))
    errors = [rms(without_dipole(maps[0] - expected[0])) / rms(without_dipole(expected[0]))]
    if len(expected) == 3:
        errors.append(rms(maps[1:] - expected[1:]) / rms(expected[1:]))
    return max(errors)


def make_sky(nside, seed=1, lmax=None):
    """Returns an invented sky: I [K_RJ] with a bright plane, Q and U at a fifth of it, an index and a curvature map.

    With lmax the maps have no structure beyond it.
    """
    random = numpy.random.default_rng(seed)
    band = lmax or 3 * nside - 1
    ell = numpy.arange(band + 1)
    spectrum = numpy.where(ell > 0, 1.0 / (ell + 3.0) ** 2.7, 0.0)

    def field(rms):
        size = healpy.Alm.getsize(band)
        alm = random.standard_normal(size) + 1j * random.standard_normal(size)
        alm[:band + 1] = alm[:band + 1].real * numpy.sqrt(2)
        values = healpy.alm2map(healpy.almxfl(alm, numpy.sqrt(spectrum)), nside, lmax=band)
        return values / numpy.std(values) * rms
    theta, _ = healpy.pix2ang(nside, numpy.arange(healpy.nside2npix(nside)))
    plane = 60 * numpy.exp(-numpy.abs(90 - numpy.degrees(theta)) / 8)
    intensity = (15 + plane) * numpy.exp(field(0.15))
    angle = field(1.0)
    sky = {"I": intensity, "Q": 0.2 * intensity * numpy.cos(2 * angle), "U": 0.2 * intensity * numpy.sin(2 * angle),
           "index": -2.9 + field(0.1), "curvature": -0.04 + field(0.02)}
    if lmax:
        alms = healpy.map2alm([sky["I"], sky["Q"], sky["U"]], lmax=lmax, iter=10)
        sky["I"], sky["Q"], sky["U"] = healpy.alm2map(alms, nside, lmax=lmax)
        sky["alms"] = alms
    return sky
