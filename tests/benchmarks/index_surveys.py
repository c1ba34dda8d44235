#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""`foreglow index` on three invented surveys of nside 512 against healpy reading and smoothing the same maps and no more.

By itself: index_surveys.py FOLDER LMAX smooths the maps of a folder and prints the seconds of the clock and of the processors.
"""

import json
import shutil
import sys
import time
from pathlib import Path

import healpy
import numpy
from astropy.io import fits

from timing import Line, Seconds, interleave, ratios, run

NSIDE = 512
SURVEYS = [("a.fits", 408e6, 20.0), ("b.fits", 1.42e9, 18.0), ("c.fits", 2.3e9, 15.0)]  # Hz, beam in arcmin
COMMON = 25.0  # arcmin, about the finest that pixels of nside 512 hold


def make_surveys(folder):
    """Writes the maps and the surveys file: a bright plane with stripes, 1 % noise, index -2.8."""
    folder.mkdir(exist_ok=True)
    random = numpy.random.default_rng(1)
    theta, phi = healpy.pix2ang(NSIDE, numpy.arange(healpy.nside2npix(NSIDE)))
    sky = 20 + 60 * numpy.exp(-numpy.abs(90 - numpy.degrees(theta)) / 8) + 3 * numpy.sin(20 * phi) * numpy.sin(theta)
    text = f'reference_frequency = "1 GHz"\nnside = {NSIDE}\nbeam_fwhm = "{COMMON} arcmin"\n'
    for name, frequency, beam in SURVEYS:
        scale = (frequency / 1e9) ** -2.8
        values = scale * sky * (1 + 0.01 * random.standard_normal(sky.size))
        table = fits.BinTableHDU.from_columns([fits.Column("I_STOKES", "E", array=values, unit="K_RJ")])
        table.header.update({"PIXTYPE": "HEALPIX", "NSIDE": NSIDE, "ORDERING": "RING", "INDXSCHM": "IMPLICIT", "COORDSYS": "G"})
        table.writeto(folder / name, overwrite=True)
        text += (f'[[survey]]\nmap = "{name}"\nfrequency = "{frequency / 1e6} MHz"\nbeam_fwhm = "{beam} arcmin"\n'
                 f'noise = "{0.3 * scale} K_RJ"\ncalibration_error = 0.05\nzero_level_error = "{scale} K_RJ"\n')
    study = folder / "surveys.toml"
    study.write_text(text)
    return study


def smooth_all(folder, lmax):
    for name, _, beam in SURVEYS:
        values = healpy.read_map(folder / name, dtype=float)
        healpy.smoothing(values, fwhm=numpy.radians(numpy.sqrt(COMMON ** 2 - beam ** 2) / 60), lmax=lmax)


def index_surveys(place):
    """How many times longer the whole index takes than the bare smoothing, healpy's at the same lmax."""
    folder = place.memory / "surveys"
    study = make_surveys(folder)
    known = {}

    def foreglow():
        out = folder / "out"
        seconds, _ = run([place.command, "index", study, "--out", out, "--quiet", "--threads", place.threads])
        known["lmax"] = json.loads((out / "run.json").read_text())["method"]["lmax"]
        shutil.rmtree(out)
        return seconds

    def bare():
        _, printed = run(["/usr/bin/python3", Path(__file__).resolve(), folder, known["lmax"]])
        return Seconds(*json.loads(printed))

    sides = interleave(place.repeats, foreglow=foreglow, bare=bare)
    yield Line("index", "index of 3 surveys, 512 / bare smoothing", ratios(sides["foreglow"], sides["bare"]), "<= 5",
               f"healpy.smoothing at lmax {known['lmax']}", sides)


def main():
    start, cpu = time.perf_counter(), time.process_time()
    smooth_all(Path(sys.argv[1]), int(sys.argv[2]))
    print(json.dumps([time.perf_counter() - start, time.process_time() - cpu]))


if __name__ == "__main__":
    main()
