# SPDX-License-Identifier: GPL-2.0-or-later
"""`foreglow at`: one answer from maps of nside 2048, the whole process, against healpy reading the file; a million rows.

The maps are invented white noise about a mean, written by astropy; their structure does not matter to a reader.
"""

import statistics
import subprocess
import sys

from timing import Line, Seconds, interleave, ratios, run

NSIDE = 2048
SINGLE = 15  # answers of one side for each pair: an answer takes milliseconds
MODEL = """reference_frequency = "408 MHz"
[intensity]
map = "at-sky.fits"
[polarization]
map = "at-sky.fits"
columns = [2, 3]
[index]
map = "at-index.fits"
[curvature]
map = "at-curvature.fits"
"""
MAKE = """
import sys
import numpy
from astropy.io import fits
folder, nside = sys.argv[1], int(sys.argv[2])
random = numpy.random.default_rng(1)
def write(name, names, mean, width, unit=None):
    fields = [fits.Column(n, "1024E", unit=unit, array=(mean + width * random.random(12 * nside ** 2, numpy.float32))
                          .astype(">f4").reshape(-1, 1024)) for n in names]
    table = fits.BinTableHDU.from_columns(fields)
    table.header.update(PIXTYPE="HEALPIX", NSIDE=nside, ORDERING="RING", INDXSCHM="IMPLICIT", COORDSYS="G", POLCCONV="COSMO")
    table.writeto(f"{folder}/at-{name}.fits")
write("sky", ["I_STOKES", "Q_STOKES", "U_STOKES"], 10, 20, "K_RJ")
write("index", ["INDEX"], -2.9, 0.2)
write("curvature", ["CURVATURE"], -0.06, 0.04)
count = 1000000
lon, lat = random.uniform(0, 360, count), numpy.degrees(numpy.arcsin(random.uniform(-1, 1, count)))
numpy.savetxt(f"{folder}/at-positions.csv", numpy.c_[lon, lat], fmt="%.7f", delimiter=",", header="lon_deg,lat_deg",
              comments="")
"""
READ = """
import sys
import time
import healpy
start, cpu = time.perf_counter(), time.process_time()
for path, fields in (a.split("=") for a in sys.argv[1:]):
    maps = healpy.read_map(path, field=[int(f) for f in fields], dtype=None)
    pixel = healpy.ang2pix(2048, 123.4, -20.1, lonlat=True)
    print([float(m[pixel]) for m in (maps if len(fields) > 1 else [maps])], file=sys.stderr)
print(time.perf_counter() - start, time.process_time() - cpu)
"""


def median_answer(place, arguments):
    """Returns the median Seconds of some single answers, the whole process."""
    answers = [run([place.command, "at", *arguments, "--position", "123.4,-20.1", "--quiet"])[0] for _ in range(SINGLE)]
    return Seconds(statistics.median(a.wall for a in answers), statistics.median(a.cpu for a in answers))


def read_by_healpy(*maps):
    """Returns the Seconds that healpy takes for the maps, Python's start and imports left out."""
    _, printed = run([sys.executable, "-c", READ, *maps])
    return Seconds(*map(float, printed.split()))


def answers(place):
    folder = place.memory
    place.require_room(folder, 1.4e9)
    subprocess.run([sys.executable, "-c", MAKE, str(folder), str(NSIDE)], check=True)
    (folder / "at-model.toml").write_text(MODEL)
    sky, index, curvature = (folder / f"at-{name}.fits" for name in ("sky", "index", "curvature"))
    for what, arguments, maps in (
            ("index map", [index], [f"{index}=0"]),
            ("model, I Q U", [folder / "at-model.toml", "--frequency", "70 MHz"],
             [f"{sky}=012", f"{index}=0", f"{curvature}=0"])):
        sides = interleave(place.repeats, at=lambda a=arguments: median_answer(place, a),
                           healpy=lambda m=maps: read_by_healpy(*m))
        note = f"an answer takes {1e3 * statistics.median(s.wall for s in sides['at']):.0f} ms"
        yield Line("answers", f"one answer, {what}, {NSIDE}: healpy reads / answer", ratios(sides["healpy"], sides["at"]), "",
                   note, sides)
        yield Line("answers", f"one answer, {what}, {NSIDE}: 50 ms / answer",
                   [Seconds(0.05, 0.05) / s for s in sides["at"]], ">= 1", note, sides)
    rows = folder / "at-rows.csv"
    many = []
    for _ in range(place.repeats):
        with open(rows, "w") as out:
            many.append(run([place.command, "at", folder / "at-model.toml", "--frequency", "70 MHz", "--quiet", "--format", "csv",
                             "--positions", folder / "at-positions.csv"], output=out)[0])
    yield Line("answers", f"a million positions of a table to csv, {NSIDE}: 1 s / run", [Seconds(1, 1) / s for s in many], "",
               "reading and writing text included", {"at": many})
