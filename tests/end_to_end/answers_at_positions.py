#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""`foreglow at`: models, studies, runs and index maps against numpy and healpy, positions, formats, pipes, refusals."""

import contextlib
import csv
import io
import json
import subprocess
import sys

import healpy
import numpy
from astropy.coordinates import SkyCoord

import harness

KEYS = ["lon_deg", "lat_deg", "frame", "nside", "pixel", "frequency_Hz", "brightness", "unit", "index", "curvature",
        "index_reference", "flux_index", "electron_slope", "Q", "U", "polarized_brightness", "polarized_fraction",
        "angle_deg"]
MODEL = """reference_frequency = "408 MHz"
[intensity]
map = "sky.fits"
zero_level = "3 K_RJ"
[polarization]
map = "sky.fits"
columns = [2, 3]
reference_frequency = "1.4 GHz"
[index]
map = "index.fits"
frequency = "1 GHz"
[curvature]
map = "curvature.fits"
"""
STUDY = """model = "model.toml"
nside = 16
stokes = "IQU"
unit = "mK_RJ"
polarization_convention = "{convention}"
precision = "{precision}"
ordering = "nested"
accuracy = 1e-8
realizations = {realizations}
[[channel]]
name = "low"
frequency = "70 MHz"
[[channel]]
name = "band"
frequency = "30 GHz"
bandwidth = "6 GHz"
"""
NSIDE = 16


class AnswersAtPositions(harness.Case):
    def setUp(self):
        super().setUp()
        self.sky = harness.make_sky(NSIDE)
        self.sky["I"][100:110] = healpy.UNSEEN
        self.write_map("sky.fits", [self.sky["I"], self.sky["Q"], self.sky["U"]], unit="K_RJ", convention="COSMO",
                       dtype=">f4", nested=True)
        self.write_map("index.fits", [self.sky["index"]], names=["INDEX"])
        self.write_map("curvature.fits", [self.sky["curvature"]], names=["CURVATURE"], dtype=">f4")
        self.write("model.toml", MODEL)

    def rows(self, *arguments, given=None):
        """Returns the rows of --format json, and the notes."""
        done = subprocess.run([sys.modules["harness"].FOREGLOW, "at", *map(str, arguments), "--format", "json"],
                              cwd=self.folder, text=True, capture_output=True, input=given,
                              env=harness.command_environment())
        self.assertEqual(done.returncode, 0, done.stderr)
        return json.loads(done.stdout), done.stderr

    def expected(self, pixel, hz):
        """Returns I, Q, U, index and curvature of the model by the formulas of docs/physics.md."""
        single = {k: numpy.float64(numpy.float32(self.sky[k][pixel])) for k in ("I", "Q", "U", "curvature")}
        c = single["curvature"]
        beta = self.sky["index"][pixel] - 2 * c * numpy.log(1e9 / 408e6)

        def ratio(a, b):
            la, lb = numpy.log(a / 408e6), numpy.log(b / 408e6)
            return numpy.exp((beta + c * la) * la - (beta + c * lb) * lb)
        return ((single["I"] - 3) * ratio(hz, 408e6), single["Q"] * ratio(hz, 1.4e9), single["U"] * ratio(hz, 1.4e9),
                beta + 2 * c * numpy.log(hz / 408e6), c, beta)

    def test_a_model_at_pixels_of_its_template(self):
        rows, notes = self.rows("model.toml", "--pixel", 5, "--pixel", 1800, "--nside", NSIDE, "--frequency", "70 MHz",
                                "--frequency", "22 GHz", "--unit", "uK_RJ")
        self.assertEqual([list(row) for row in rows], [KEYS] * 4)
        for row, (pixel, hz) in zip(rows, [(5, 70e6), (5, 22e9), (1800, 70e6), (1800, 22e9)]):
            i, q, u, beta, c, reference = self.expected(pixel, hz)
            lon, lat = healpy.pix2ang(NSIDE, pixel, lonlat=True)
            # A few roundings of exp and log at arguments up to 12: 1e-14; the positions by sin and cos: 1e-13.
            numpy.testing.assert_allclose([row["lon_deg"], row["lat_deg"]], [lon, lat], rtol=1e-13)
            numpy.testing.assert_allclose([row["brightness"], row["Q"], row["U"]], numpy.array([i, q, u]) * 1e6,
                                          rtol=1e-13)
            numpy.testing.assert_allclose(
                [row["index"], row["curvature"], row["index_reference"], row["flux_index"], row["electron_slope"]],
                [beta, c, reference, beta + 2, -3 - 2 * beta], rtol=1e-13)
            numpy.testing.assert_allclose(
                [row["polarized_brightness"], row["polarized_fraction"], row["angle_deg"]],
                [numpy.hypot(q, u) * 1e6, numpy.hypot(q, u) / i, numpy.degrees(numpy.arctan2(u, q)) / 2], rtol=1e-13)
            self.assertEqual((row["frame"], row["nside"], row["pixel"], row["frequency_Hz"], row["unit"]),
                             ("galactic", NSIDE, pixel, hz, "uK_RJ"))
        self.assertIn("COSMO", notes)
        self.assertIn("template's own pixel", notes)

    def test_positions_fall_into_the_pixels_that_healpy_finds(self):
        random = numpy.random.default_rng(3)
        lon, lat = random.uniform(0, 360, 2000), numpy.degrees(numpy.arcsin(random.uniform(-1, 1, 2000)))
        table = "name,lat_deg,lon_deg\n" + "".join(f"x,{b!r},{l!r}\n" for l, b in zip(lon.tolist(), lat.tolist()))
        rows, _ = self.rows("model.toml", "--positions", "-", "--frequency", "1 GHz", given=table)
        pixels = healpy.ang2pix(NSIDE, lon, lat, lonlat=True)
        self.assertEqual([row["pixel"] for row in rows], pixels.tolist())
        self.assertEqual([row["lon_deg"] for row in rows], lon.tolist())
        undefined = (pixels >= 100) & (pixels < 110)
        self.assertGreater(undefined.sum(), 0)
        for row, missing, pixel in zip(rows, undefined, pixels):
            if missing:
                self.assertIsNone(row["brightness"])
            else:
                self.assertAlmostEqual(row["brightness"], self.expected(pixel, 1e9)[0], delta=1e-12)

    def test_a_beamless_study_and_its_run_are_what_make_writes(self):
        for convention, precision, realizations in (("COSMO", "float32", 1), ("IAU", "float64", 2)):
            study = self.write("study.toml", STUDY.format(convention=convention, precision=precision,
                                                          realizations=realizations))
            self.foreglow("make", study, "--out", "out", "--replace", "--quiet")
            pixels = [0, 7, 105, 1500, 3071]
            asked = [word for p in pixels for word in ("--pixel", p)] + ["--nside", NSIDE]
            made, _ = self.rows("study.toml", *asked)
            ran, _ = self.rows("out", *asked)
            truth, _ = harness.read_maps(self.folder / "out/truth/index.fits")
            for k, name in enumerate(("low", "band")):
                maps, _ = harness.read_maps(self.folder /
                                            f"out/maps/{name}{'_r0000' if realizations > 1 else ''}.fits")
                for n, pixel in enumerate(pixels):
                    for rows, tolerance in ((ran, 0), (made, 2e-7 if precision == "float32" else 2e-9)):
                        row = rows[2 * n + k]
                        got = [numpy.nan if row[key] is None else row[key] for key in ("brightness", "Q", "U")]
                        # A run's values are those of the files, to the last digit. A study's are exact sums: float32
                        # rounds by 6e-8 and make's exponential for float32 by 3e-10; else accuracy / 10 is the bound.
                        numpy.testing.assert_allclose(got, maps[:, pixel], rtol=tolerance, atol=0)
                        self.assertEqual((row["unit"], row["channel"][:len(name)]), ("mK_RJ", name))
                        if not numpy.isnan(truth[0][pixel]):
                            self.assertAlmostEqual(row["index_reference"], truth[0][pixel], delta=2e-7)

    def test_a_run_at_other_frequencies_follows_its_truth(self):
        self.write("study.toml", STUDY.format(convention="COSMO", precision="float64", realizations=1))
        self.foreglow("make", "study.toml", "--out", "out", "--quiet")
        rows, notes = self.rows("out", "--pixel", 42, "--nside", NSIDE, "--frequency", "5 GHz")
        i, q, u, beta, _, _ = self.expected(42, 5e9)
        # Truth is carried to 408 MHz and back, some roundings more.
        numpy.testing.assert_allclose([rows[0]["brightness"], rows[0]["Q"], rows[0]["U"], rows[0]["index"]],
                                      [i, q, u, beta], rtol=1e-12)
        self.assertIn("truth", notes)

    def test_random_structure_is_in_a_study_and_not_in_a_model(self):
        self.write("model.toml", MODEL.replace('zero_level = "3 K_RJ"', 'beam_fwhm = "20 deg"') .replace(
            "[curvature]", "scatter = 0.2\nscatter_slope = -2.5\nscatter_lrange = [2, 30]\n[curvature]"))
        bare, notes = self.rows("model.toml", "--pixel", 42, "--nside", NSIDE, "--frequency", "1 GHz")
        self.assertAlmostEqual(bare[0]["index"], self.sky["index"][42], delta=1e-13)
        self.assertIn("no seed", notes)
        self.write("study.toml", STUDY.format(convention="COSMO", precision="float64", realizations=2))
        self.foreglow("make", "study.toml", "--out", "out", "--quiet")
        for realization in (0, 1):
            rows, notes = self.rows("study.toml", "--pixel", 42, "--nside", NSIDE, "--realization", realization)
            maps, _ = harness.read_maps(self.folder / f"out/maps/low_r{realization:04d}.fits")
            self.assertGreater(abs(rows[0]["index_reference"] - bare[0]["index_reference"]), 1e-3)
            # One frequency: the law itself on both sides, some roundings.
            numpy.testing.assert_allclose([rows[0]["brightness"], rows[0]["Q"], rows[0]["U"]], maps[:, 42], rtol=1e-12)
            self.assertIn("whole sky", notes)

    def test_electrons(self):
        self.write_map("field.fits", [5 + 2 * numpy.cos(numpy.arange(3072.0))], names=["FIELD"])
        head = MODEL[:MODEL.index("[curvature]")].replace("1.4 GHz", "22.8 GHz")
        for electrons in ('field = "5 uG"\nbreak_energy = "10 GeV"\ncutoff_energy = "300 GeV"\n',
                          'field_map = "field.fits"\ncutoff_energy = "200 GeV"\ncutoff = "sharp"\n'):
            self.write("model.toml", head + "[electrons]\n" + electrons)
            self.write("study.toml", STUDY.format(convention="COSMO", precision="float64", realizations=1))
            self.foreglow("make", "study.toml", "--out", "out", "--quiet", "--replace")
            index, _ = harness.read_maps(self.folder / "out/truth/index.fits")
            pixels = [3, 105, 1500]
            asked = [word for p in pixels for word in ("--pixel", p)] + ["--nside", NSIDE]
            rows, _ = self.rows("study.toml", *asked)
            ran, notes = self.rows("out", *asked)
            self.assertIn("no curved power laws", notes)
            for k, name in enumerate(("low", "band")):
                maps, _ = harness.read_maps(self.folder / f"out/maps/{name}.fits")
                for n, pixel in enumerate(pixels):
                    row = rows[2 * n + k]
                    got = [numpy.nan if row[key] is None else row[key] for key in ("brightness", "Q", "U")]
                    # make promises accuracy / 10 = 1e-9 of each pixel here, at is ten times better.
                    numpy.testing.assert_allclose(got, maps[:, pixel], rtol=3e-9)
                    self.assertIsNone(ran[2 * n + k]["index"])
                    if not numpy.isnan(index[0][pixel]):
                        # truth and stencil are good to 1e-7 and some 1e-7 of a fifth derivative
                        self.assertAlmostEqual(row["index_reference"], index[0][pixel], delta=1e-6)
                        self.assertEqual(ran[2 * n + k]["index_reference"], index[0][pixel])
            near, _ = self.rows("model.toml", "--pixel", 3, "--nside", NSIDE, "--frequency", "29.97 GHz", "--frequency",
                                "30 GHz", "--frequency", "30.03 GHz")
            slope = numpy.log(near[2]["brightness"] / near[0]["brightness"]) / numpy.log(30.03 / 29.97)
            self.assertAlmostEqual(near[1]["index"], slope, delta=3e-6)  # h^2/6 of the third derivative, h = 1e-3
            self.assertEqual(near[0]["electron_slope"], near[2]["electron_slope"])
            self.assertGreater(abs(near[0]["electron_slope"] - (-3 - 2 * near[0]["index"])), 1e-3)  # a power law has 0

    def test_the_galaxy(self):
        self.write("study.toml", STUDY.format(convention="COSMO", precision="float64", realizations=1).replace(
            "model.toml", "disc-and-loops"))
        self.foreglow("make", "study.toml", "--out", "out", "--quiet")
        index, _ = harness.read_maps(self.folder / "out/truth/index.fits")
        pixels = [100, 1500, 1530, 3000]
        rows, notes = self.rows("study.toml", *[word for p in pixels for word in ("--pixel", p)], "--nside", NSIDE)
        self.assertIn("not a measurement", notes)
        for k, name in enumerate(("low", "band")):
            maps, _ = harness.read_maps(self.folder / f"out/maps/{name}.fits")
            for n, pixel in enumerate(pixels):
                row = rows[2 * n + k]
                # accuracy = 1e-8 of the study; lines of sight are sampled alike where both take the usual steps.
                self.assertAlmostEqual(row["brightness"] / maps[0][pixel], 1, delta=2e-8)
                for key, value in (("Q", maps[1][pixel]), ("U", maps[2][pixel])):
                    self.assertAlmostEqual(row[key] / maps[0][pixel], value / maps[0][pixel], delta=2e-8)
                self.assertAlmostEqual(row["index_reference"], index[0][pixel], delta=1e-7)  # the same five frequencies
        bare, _ = self.rows("disc-and-loops", "--position", "120,30", "--frequency", "999 MHz", "--frequency", "1 GHz",
                            "--frequency", "1001 MHz")
        self.assertEqual(bare[0]["nside"], 128)
        slope = numpy.log(bare[2]["brightness"] / bare[0]["brightness"]) / numpy.log(1001 / 999)
        self.assertAlmostEqual(bare[1]["index"], slope, delta=1e-4)  # the stencil's: 0.3^4/30 of a fifth derivative

    def test_discs_and_interpolation(self):
        lon, lat = 213.7, -41.2
        rows, _ = self.rows("model.toml", "--position", f"{lon},{lat}", "--frequency", "5 GHz", "--disc", "12 deg")
        inside = healpy.query_disc(NSIDE, healpy.ang2vec(lon, lat, lonlat=True), numpy.radians(12))
        values = numpy.array([self.expected(p, 5e9) for p in inside])
        i, beta = values[:, 0], values[:, 3]
        self.assertEqual(rows[0]["pixels"], len(inside))
        mean_index = numpy.sum(i * beta) / numpy.sum(i)
        curvature = numpy.sum(i * (values[:, 4] + beta ** 2 / 2)) / numpy.sum(i) - mean_index ** 2 / 2
        numpy.testing.assert_allclose(
            [rows[0]["brightness"], rows[0]["scatter"], rows[0]["index"], rows[0]["curvature"]],
            [i.mean(), i.std(), mean_index, curvature], rtol=1e-10)
        # The index is the slope of the mean brightness, whatever its formula: central difference, error 1e-8.
        near, _ = self.rows("model.toml", "--position", f"{lon},{lat}", "--disc", "12 deg", "--frequency", "4999.5 MHz",
                            "--frequency", "5000.5 MHz")
        slope = (numpy.log(near[1]["brightness"] / near[0]["brightness"]) / numpy.log(5000.5 / 4999.5))
        self.assertAlmostEqual(rows[0]["index"], slope, delta=1e-7)
        rows, _ = self.rows("model.toml", "--position", f"{lon},{lat}", "--frequency", "5 GHz", "--interpolate")
        whole = numpy.array([self.expected(p, 5e9)[0] for p in range(healpy.nside2npix(NSIDE))])
        self.assertAlmostEqual(rows[0]["brightness"] / healpy.get_interp_val(whole, lon, lat, lonlat=True), 1,
                               delta=1e-12)

    def test_icrs_positions_turn_q_and_u(self):
        rows, notes = self.rows("model.toml", "--position", "05:34:31.9,+22:00:52", "--frame", "icrs", "--frequency",
                                "1.4 GHz")
        there = SkyCoord("05h34m31.9s", "+22d00m52s", frame="icrs")
        self.assertAlmostEqual(rows[0]["lon_deg"], there.ra.deg, delta=1e-10)
        galactic = there.galactic
        pixel = healpy.ang2pix(NSIDE, galactic.l.deg, galactic.b.deg, lonlat=True)
        self.assertEqual(rows[0]["pixel"], pixel)
        # The angle between the two meridians, from astropy: position angle of the galactic pole, from icrs north
        # through east. IAU angles grow that way, COSMO's U has the other sign.
        lon, lat = healpy.pix2ang(NSIDE, pixel, lonlat=True)
        centre = SkyCoord(lon, lat, frame="galactic", unit="deg")
        pole = SkyCoord(0, 90, frame="galactic", unit="deg").icrs
        turn = centre.icrs.position_angle(pole).rad
        _, q, u, *_ = self.expected(pixel, 1.4e9)
        chi = 0.5 * numpy.arctan2(-u, q) + turn  # IAU, galactic to icrs
        # astropy's frames differ from the rotation matrix here by milliarcseconds: 1e-8 rad.
        numpy.testing.assert_allclose([rows[0]["Q"], -rows[0]["U"]], numpy.hypot(q, u) * numpy.array(
            [numpy.cos(2 * chi), numpy.sin(2 * chi)]), rtol=1e-6, atol=1e-7 * numpy.hypot(q, u))
        iau, notes = self.rows("model.toml", "--position", "05:34:31.9,+22:00:52", "--frame", "icrs", "--frequency",
                               "1.4 GHz", "--polarization-convention", "IAU")
        self.assertEqual(iau[0]["U"], -rows[0]["U"])
        self.assertAlmostEqual(iau[0]["angle_deg"], -rows[0]["angle_deg"], delta=1e-12)
        self.assertIn("IAU", notes)

    def test_index_maps(self):
        rows, notes = self.rows("index.fits", "--pixel", 9, "--pixel", 77, "--nside", NSIDE, "--nested")
        ring = healpy.nest2ring(NSIDE, [9, 77])
        self.assertEqual([row["index"] for row in rows], self.sky["index"][ring].tolist())
        for row in rows:
            for key in ("brightness", "unit", "curvature", "Q", "angle_deg", "frequency_Hz"):
                self.assertIsNone(row[key])
        self.assertIn("INDEX", notes)
        rows, _ = self.rows("index.fits", "--position", "10,80", "--disc", "20 deg")
        inside = healpy.query_disc(NSIDE, healpy.ang2vec(10, 80, lonlat=True), numpy.radians(20))
        values = self.sky["index"][inside]
        self.assertEqual(rows[0]["pixels"], len(inside))
        numpy.testing.assert_allclose([rows[0]["index"], rows[0]["scatter"]], [values.mean(), values.std()], rtol=1e-11)

    def test_the_folder_that_index_leaves(self):
        text = 'reference_frequency = "1 GHz"\nnside = 16\nbeam_fwhm = "20 deg"\n'
        for name, hz in (("a", 408e6), ("b", 1.4e9)):
            self.write_map(f"{name}.fits", [20 * (hz / 1e9) ** -2.7 * numpy.ones(3072)], unit="K_RJ")
            text += f'[[survey]]\nmap = "{name}.fits"\nfrequency = "{hz} Hz"\nnoise = "0.001 K_RJ"\nbeam_fwhm = "20 deg"\n'
        self.write("surveys.toml", text)
        self.foreglow("index", "surveys.toml", "--out", "fit", "--quiet")
        for source in ("fit", "fit/index.fits"):
            rows, _ = self.rows(source, "--position", "10,20", "--frequency", "2 GHz")
            # Two uniform maps without noise in them: float32 files and the fit's own rounding.
            self.assertAlmostEqual(rows[0]["index"], -2.7, delta=1e-4)
            if source == "fit":
                self.assertAlmostEqual(rows[0]["brightness"] / (20 * 2 ** -2.7), 1, delta=1e-4)
            else:
                self.assertIsNone(rows[0]["brightness"])

    def test_partial_and_bare_index_maps(self):
        listed = numpy.sort(numpy.random.default_rng(1).permutation(3072)[:500])
        self.write_map("part.fits", [self.sky["index"]], names=["INDEX"], pixels=listed, frame=None)
        self.foreglow("at", "part.fits", "--position", "0,0", status=2)
        rows, _ = self.rows("part.fits", "--map-frame", "galactic", "--positions", "-", "--nside", NSIDE,
                            given="pixel\n" + "".join(f"{p}\n" for p in range(3072)))
        got = numpy.array([numpy.nan if row["index"] is None else row["index"] for row in rows])
        expected = numpy.full(3072, numpy.nan)
        expected[listed] = self.sky["index"][listed]
        numpy.testing.assert_array_equal(got, expected)

    def test_formats_agree(self):
        asked = ["model.toml", "--position", "30,40", "--position", "-10,-20", "--frequency", "1 GHz:100 GHz:3"]
        rows, _ = self.rows(*asked)
        numpy.testing.assert_allclose([row["frequency_Hz"] for row in rows], [1e9, 1e10, 1e11] * 2, rtol=1e-14)
        done = self.foreglow("at", *asked, "--format", "csv", "--quiet")
        self.assertEqual(done.stderr, "")
        table = list(csv.DictReader(io.StringIO(done.stdout)))
        self.assertEqual(list(table[0]), KEYS)
        for row, line in zip(rows, table):
            for key in KEYS:
                self.assertEqual(line[key] if isinstance(row[key], str) else float(line[key]), row[key])
        lines = self.foreglow("at", *asked).stdout.splitlines()
        self.assertEqual(len(lines), 2 + 6)
        self.assertIn("K_RJ", lines[1])

    def test_rows_come_as_positions_come_and_a_closed_pipe_is_quiet(self):
        command = [sys.modules["harness"].FOREGLOW, "at", "model.toml", "--positions", "-", "--frequency", "1 GHz",
                   "--format", "csv", "--quiet"]
        with subprocess.Popen(command, cwd=self.folder, stdin=subprocess.PIPE, stdout=subprocess.PIPE,
                              stderr=subprocess.PIPE, text=True, env=harness.command_environment()) as process:
            process.stdin.write("lon_deg,lat_deg\n10,20\n")
            process.stdin.flush()
            self.assertTrue(process.stdout.readline().startswith("lon_deg"))
            self.assertTrue(process.stdout.readline().startswith("10,20,"))  # before the input has ended
            process.stdout.close()
            with contextlib.suppress(BrokenPipeError):  # it may be gone by then, which is right
                process.stdin.write("11,20\n" * 200000)
                process.stdin.close()
            self.assertEqual(process.wait(), 0)
            self.assertEqual(process.stderr.read(), "")

    def test_refusals(self):
        one = ["--frequency", "1 GHz"]
        for arguments, words in (
                (["model.toml", "--position", "10,95", *one], "beyond 90 deg"),
                (["model.toml", "--position", "10,20", "--frame", "equatorial", *one], "use one of"),
                (["model.toml", "--pixel", 3072, "--nside", 16, *one], "no pixel 3072"),
                (["model.toml", "--pixel", 0, "--nside", 17, *one], "power of two"),
                (["model.toml", "--position", "10,20"], "--frequency"),
                (["model.toml", *one], "--position"),
                (["model.toml", "--position", "10", *one], "LON,LAT"),
                (["model.toml", "--position", "05:34,20", *one], "icrs"),
                (["model.toml", "--position", "10,20", "--frequency", "30"], "no unit"),
                (["model.toml", "--position", "10,20", "--frequency", "1 GHz:2 GHz"], "log grid"),
                (["model.toml", "--position", "10,20", "--unit", "K", *one], "--unit"),
                (["model.toml", "--position", "10,20", "--disc", "2", *one], "--disc"),
                (["model.toml", "--positions", "none.csv", *one], "none.csv"),
                (["disc-and-lops", "--position", "10,20", *one], "disc-and-loops"),
                (["sky.fits", "--position", "10,20"], "brightness and no index"),
                ([".", "--position", "10,20"], "run.json")):
            done = self.foreglow("at", *arguments, status=2)
            self.assertEqual(done.stdout, "")
            self.assertIn(words, done.stderr)
            self.assertEqual(len(done.stderr.strip().splitlines()), 1)
        self.write("bad.csv", "lon_deg,lat_deg\n1,2\n3,four\n")
        done = self.foreglow("at", "model.toml", "--positions", "bad.csv", *one, status=1)
        self.assertIn("bad.csv:3", done.stderr)


if __name__ == "__main__":
    harness.main()
