#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Makes a study's maps as most people write it with numpy and healpy, for comparison: nothing is slowed down on purpose.

Float64 throughout, a band as a sum over 11 frequencies, healpy.smoothing with its defaults (three iterations, lmax 3 nside - 1)
for each channel. Its other conventions are those of careful_study.py, and so are usage and output.
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
warnings.simplefilter("ignore")


def both_clocks():
    return time.perf_counter(), time.process_time()


def number(text):
    return float(text.split()[0])


def kelvin_rj_per_kelvin_cmb(nu):
    x = H_OVER_K_T * nu * 1e9
    return x ** 2 * numpy.exp(x) / (numpy.exp(x) - 1) ** 2


def main(study_path, out_folder, every=1):
    clocks = [both_clocks()]
    folder, out_folder = Path(study_path).parent, Path(out_folder)
    study = tomllib.loads(Path(study_path).read_text())
    model = tomllib.loads((folder / study["model"]).read_text())
    reference = number(model["reference_frequency"])
    sky = numpy.array(healpy.read_map(folder / model["intensity"]["map"], field=(0, 1, 2), dtype=float))
    index = healpy.read_map(folder / model["index"]["map"], dtype=float)
    curvature = healpy.read_map(folder / model["curvature"]["map"], dtype=float)
    out_folder.mkdir(parents=True, exist_ok=True)
    clocks.append(both_clocks())
    for channel in study["channel"][::every]:
        center, width = number(channel["frequency"]), number(channel["bandwidth"])
        frequencies = numpy.linspace(center - width / 2, center + width / 2, 11)
        weights = numpy.ones(11)
        weights[[0, -1]] = 0.5  # trapezoidal rule
        maps = numpy.zeros_like(sky)
        for nu, weight in zip(frequencies, weights):
            maps += weight * sky * (nu / reference) ** (index + curvature * numpy.log(nu / reference))
        maps *= 1e6 / numpy.sum(weights * kelvin_rj_per_kelvin_cmb(frequencies))
        if "beam_fwhm" in channel:
            maps = healpy.smoothing(maps, fwhm=numpy.radians(number(channel["beam_fwhm"]) / 60))
        healpy.write_map(out_folder / f"{channel['name']}.fits", maps, dtype=numpy.float32, coord="G",
                         column_units=study["unit"], overwrite=True)
        clocks.append(both_clocks())
    print(json.dumps(numpy.diff(clocks, axis=0).tolist()))


if __name__ == "__main__":
    main(sys.argv[1], sys.argv[2], int(sys.argv[3]) if len(sys.argv) > 3 else 1)
