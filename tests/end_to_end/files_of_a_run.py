#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""What a run leaves: files that every reader opens without a word, the same bytes from any number of threads, a true manifest.

Run with two arguments: the command, and the small C++ reader built beside these tests.
"""

import hashlib
import json
import re
import socket
import subprocess
import sys
import warnings

import healpy
import numpy
from astropy.io import fits

import harness

CXX_READER = None
STUDY = """title = "files"
model = "model.toml"
nside = 32
stokes = "IQU"
unit = "uK_CMB"
seed = 7
{extra}
[[channel]]
name = "low"
frequency = "30 GHz"
bandwidth = "6 GHz"
beam_fwhm = "3 deg"
[[channel]]
name = "high"
frequency = "143 GHz"
"""
MODEL = """title = "invented"
reference_frequency = "408 MHz"
[intensity]
map = "sky.fits"
beam_fwhm = "56 arcmin"
[polarization]
map = "sky.fits"
columns = [2, 3]
[index]
map = "index.fits"
[curvature]
value = -0.04
"""


class FilesOfARun(harness.Case):
    def setUp(self):
        super().setUp()
        sky = harness.make_sky(32)
        self.write_map("sky.fits", [sky["I"], sky["Q"], sky["U"]], unit="K_RJ", convention="COSMO")
        self.write_map("index.fits", [sky["index"]], names=["INDEX"])
        self.write("model.toml", MODEL)

    def make(self, extra="", out="out", options=()):
        self.write("study.toml", STUDY.format(extra=extra))
        self.foreglow("make", "study.toml", "--out", out, "--quiet", *options)
        return self.folder / out

    def every_map(self, out):
        found = sorted(out.rglob("*.fits"))
        self.assertGreaterEqual(len(found), 2)
        return found

    def read_with_everything(self, path):
        done = subprocess.run(["fitsverify", path], capture_output=True, text=True)
        self.assertIn("0 warning(s) and 0 error(s)", done.stdout, done.stdout)
        with warnings.catch_warnings():
            warnings.simplefilter("error")
            warnings.filterwarnings("ignore", category=DeprecationWarning)  # of the readers' own code, not of the file
            with fits.open(path, checksum=True) as file:  # a wrong or missing sum is a warning, so an error here
                file.verify("exception")
                header = file[1].header
                self.assertIn("CHECKSUM", header)
                self.assertIn("DATASUM", header)
                nside, count = header["NSIDE"], header["TFIELDS"] - (header["INDXSCHM"] == "EXPLICIT")
            partial = header["INDXSCHM"].strip() == "EXPLICIT"
            mine, _ = harness.read_maps(path)
            theirs = numpy.atleast_2d(healpy.read_map(path, field=range(count), partial=partial, dtype=None))
        theirs = numpy.where(theirs == healpy.UNSEEN, numpy.nan, theirs)
        numpy.testing.assert_array_equal(mine, theirs.astype(float))
        if not partial:  # that library reads full-sky files only
            done = subprocess.run([CXX_READER, path, str(count)], capture_output=True, text=True)
            self.assertEqual(done.returncode, 0, done.stdout + done.stderr)
            cxx_nside, *sums = done.stdout.split()
            self.assertEqual(int(cxx_nside), nside)
            # The same pixels in the same order, weighted by 1..npix; doubles summed in another order: 1e-12.
            weights = numpy.arange(1, mine.shape[1] + 1) / mine.shape[1]
            for total, values in zip(sums, mine):
                defined = numpy.isfinite(values)
                self.assertAlmostEqual(float(total), numpy.sum((values * weights)[defined]),
                                       delta=1e-12 * numpy.sum(numpy.abs(values[defined])))
        return header

    def test_every_reader_opens_every_file(self):
        for extra in ("", 'ordering = "nested"\nprecision = "float64"\n',
                      'frame = "icrs"\npolarization_convention = "IAU"\n'):
            with self.subTest(extra=extra):
                out = self.make(extra, options=("--replace",))
                for path in self.every_map(out):
                    header = self.read_with_everything(path)
                    if path.parent.name == "maps":
                        self.assertEqual(header["POLCCONV"].strip(), "IAU" if "IAU" in extra else "COSMO")
                        self.assertEqual(header["COORDSYS"].strip(), "C" if "icrs" in extra else "G")

    def test_partial_sky_files(self):
        footprint = numpy.zeros(healpy.nside2npix(32))
        footprint[100:900] = 1
        self.write_map("footprint.fits", [footprint], names=["COVERAGE"])
        out = self.make('coverage = "footprint.fits"\ntruth = false\n')
        for path in self.every_map(out):
            header = self.read_with_everything(path)
            self.assertEqual(header["OBJECT"].strip(), "PARTIAL")
            self.assertEqual(header["NAXIS2"], 800)

    def test_header_of_a_channel(self):
        out = self.make()
        header = fits.getheader(out / "maps/low.fits", 1)
        expected = {"PIXTYPE": "HEALPIX", "ORDERING": "RING", "NSIDE": 32, "FIRSTPIX": 0,
                    "LASTPIX": healpy.nside2npix(32) - 1, "INDXSCHM": "IMPLICIT", "OBJECT": "FULLSKY", "COORDSYS": "G",
                    "POLCCONV": "COSMO", "TUNIT1": "uK_CMB", "TUNIT2": "uK_CMB", "KSCALE": "CMB", "FREQ": 30e9,
                    "BANDWID": 6e9, "BEAMFWHM": 3.0, "SEED": 7, "REALIZ": 0, "TTYPE1": "I_STOKES", "TTYPE2": "Q_STOKES",
                    "TTYPE3": "U_STOKES"}
        for key, value in expected.items():
            self.assertEqual(header[key], value, key)
        self.assertAlmostEqual(header["SKYFWHM"], 56 / 60, places=9)
        self.assertLessEqual(header["ACCURACY"], 1e-5)
        self.assertNotIn("DATE", header)
        self.foreglow("make", "study.toml", "--out", "dated", "--quiet",
                      environment={"SOURCE_DATE_EPOCH": "86400"})
        self.assertTrue(fits.getheader(self.folder / "dated/maps/low.fits", 1)["DATE"].startswith("1970-01-02"))

    def test_same_bytes_from_any_number_of_threads(self):
        reference = {}
        for threads in (1, 2, 4):
            out = self.make('frame = "ecliptic"', out=f"out{threads}", options=("--threads", threads))
            digests = {path.relative_to(out): hashlib.sha256(path.read_bytes()).hexdigest() for path in self.every_map(out)}
            reference = reference or digests
            self.assertEqual(digests, reference, f"{threads} threads")

    def test_manifest(self):
        out = self.make(options=("--sha256",))
        text = (out / "run.json").read_text()
        manifest = json.loads(text)
        self.assertNotIn(str(self.folder), text)
        self.assertNotRegex(text, r'"/[a-z]')
        self.assertNotRegex(text, rf"\b{re.escape(socket.gethostname())}\b")
        hashes = dict(find_hashes(manifest))
        for path in self.every_map(out) + [out / "report.html"]:
            digest = hashlib.sha256(path.read_bytes()).hexdigest()
            self.assertIn(digest, text, path)
        for name in ("sky.fits", "index.fits"):
            self.assertIn(hashlib.sha256((self.folder / name).read_bytes()).hexdigest(), text, name)
        self.assertTrue(hashes)
        try:
            import xxhash
        except ImportError:
            return
        for path in self.every_map(out):
            self.assertIn(xxhash.xxh3_128(path.read_bytes()).hexdigest(), text)

    def test_truth_maps(self):
        out = self.make()
        sky = harness.make_sky(32)
        amplitude, header = harness.read_maps(out / "truth/amplitude.fits")
        self.assertEqual(header["TUNIT1"].strip(), "K_RJ")
        index, _ = harness.read_maps(out / "truth/index.fits")
        curvature, _ = harness.read_maps(out / "truth/curvature.fits")
        # Written as float32, whose rounding is 6e-8.
        self.assertLess(harness.pixel_error(amplitude, numpy.array([sky["I"], sky["Q"], sky["U"]])), 1e-6)
        self.assertLess(harness.pixel_error(index, [sky["index"]]), 1e-6)
        self.assertLess(harness.pixel_error(curvature, [numpy.full_like(sky["I"], -0.04)]), 1e-6)
        out = self.make("truth = false", out="without")
        self.assertFalse((out / "truth").exists())


def find_hashes(node, path=""):
    """Yields (place, text) of everything in the manifest that looks like a hash of 128 or 256 bits."""
    if isinstance(node, dict):
        for key, value in node.items():
            yield from find_hashes(value, f"{path}/{key}")
    elif isinstance(node, list):
        for number, value in enumerate(node):
            yield from find_hashes(value, f"{path}/{number}")
    elif isinstance(node, str) and re.fullmatch("[0-9a-f]{32}|[0-9a-f]{64}", node):
        yield path, node


if __name__ == "__main__":
    CXX_READER = sys.argv.pop(2)
    harness.main()
