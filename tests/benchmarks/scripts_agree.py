#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Checks that the two comparison scripts make the maps that the command makes, so that speeds are those of one job.

Usage: scripts_agree.py FOREGLOW
"""

import subprocess
import sys
import tempfile
from pathlib import Path

import healpy
import numpy

sys.path.insert(0, str(Path(__file__).resolve().parent))
import careful_study  # noqa: E402
import make_inputs  # noqa: E402
import plain_study  # noqa: E402

# The trapezoidal rule of plain_study.py is good to 6e-4 (steps h of 2.5 % of nu: h^2/12 times the second derivative of nu^-2.8
# is 5e-4), the transforms of both scripts to 3e-4 at nside 16; a wrong unit, weight, beam or sign shows at 1e-2 or more.
TOLERANCE = 1e-3
NSIDE = 16


def rms(values):
    return numpy.sqrt(numpy.mean(numpy.square(values)))


def compare(what, name, maps, expected):
    errors = [rms(maps[0] - expected[0]) / rms(expected[0]), rms(maps[1:] - expected[1:]) / rms(expected[1:])]
    print(f"{what} {name}: I {errors[0]:.1e}, Q and U {errors[1]:.1e}")
    return max(errors) <= TOLERANCE


def main(command):
    good = True
    with tempfile.TemporaryDirectory() as folder:
        for beams in (False, True):
            # Beams of 40 degrees at 30 GHz: far above the pixels, where all three kinds of transform agree.
            study = make_inputs.make_study(folder, NSIDE, 2, beams, low=30.0, high=44.0, beam_scale=2400.0)
            for script in (careful_study, plain_study):
                script.main(study, Path(folder) / script.__name__)
            out = Path(folder) / "out"
            subprocess.run([command, "make", study, "--out", out, "--replace", "--quiet"], check=True)
            for name in ("c0000", "c0001"):
                expected = healpy.read_map(out / "maps" / f"{name}.fits", field=(0, 1, 2), dtype=float)
                for script in (careful_study, plain_study):
                    maps = healpy.read_map(Path(folder) / script.__name__ / f"{name}.fits", field=(0, 1, 2), dtype=float)
                    good &= compare(script.__name__, f"{name} {'with' if beams else 'without'} a beam", maps, expected)
    return 0 if good else f"a script is off by more than {TOLERANCE}"


if __name__ == "__main__":
    if len(sys.argv) != 2:
        sys.exit(__doc__)
    sys.exit(main(sys.argv[1]))
