#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""How a run is asked for and how it ends: options, coverage, monopole, ordering, plan, refusals, a signal."""

import json
import signal
import subprocess
import sys
import time

import healpy
import numpy

import harness

MODEL = """reference_frequency = "408 MHz"
[intensity]
map = "sky.fits"
[polarization]
map = "sky.fits"
columns = [2, 3]
[index]
value = -2.9
"""
STUDY = """model = "model.toml"
nside = 32
stokes = "IQU"
unit = "K_RJ"
precision = "float64"
truth = false
{extra}
[[channel]]
name = "a"
frequency = "1 GHz"
"""


class Running(harness.Case):
    def setUp(self):
        super().setUp()
        self.sky = harness.make_sky(32)
        self.maps = numpy.array([self.sky["I"], self.sky["Q"], self.sky["U"]])
        self.expected = self.maps * (1000 / 408) ** -2.9
        self.write_map("sky.fits", self.maps, unit="K_RJ", convention="COSMO")
        self.write("model.toml", MODEL)
        self.write("study.toml", STUDY.format(extra=""))

    def make(self, *options, extra="", out="out", name="a", status=0):
        self.write("study.toml", STUDY.format(extra=extra))
        self.foreglow("make", "study.toml", "--out", out, "--quiet", *options, status=status)
        return harness.read_maps(self.folder / out / f"maps/{name}.fits") if status == 0 else None

    def assert_same(self, maps, expected):
        # One exp, one log and a product: 1e-15 each; 1e-12 leaves room for another order of the same arithmetic.
        numpy.testing.assert_allclose(maps, expected, rtol=1e-12, atol=1e-12 * numpy.nanmax(numpy.abs(expected)))

    def test_nested(self):
        maps, header = self.make(extra='ordering = "nested"')
        self.assertEqual(header["ORDERING"].strip(), "NESTED")
        self.assert_same(maps, self.expected)

    def test_iau_turns_the_sign_of_u(self):
        maps, header = self.make(extra='polarization_convention = "IAU"')
        self.assertEqual(header["POLCCONV"].strip(), "IAU")
        self.assert_same(maps, self.expected * numpy.array([[1.0], [1.0], [-1.0]]))

    def test_monopole_removed(self):
        maps, _ = self.make(extra='monopole = "remove"')
        self.assert_same(maps[0], self.expected[0] - numpy.mean(self.expected[0]))
        self.assert_same(maps[1:], self.expected[1:])

    def test_coverage_writes_only_those_pixels(self):
        inside = healpy.query_disc(32, healpy.ang2vec(0.6, 1.2), 0.4)
        footprint = numpy.zeros(healpy.nside2npix(32))
        footprint[inside] = 1
        self.write_map("footprint.fits", [footprint], names=["COVERAGE"])
        for ordering in ("ring", "nested"):
            maps, header = self.make("--replace", extra=f'coverage = "footprint.fits"\nordering = "{ordering}"')
            self.assertEqual(header["INDXSCHM"].strip(), "EXPLICIT")
            self.assertEqual(header["OBJECT"].strip(), "PARTIAL")
            self.assertTrue(numpy.array_equal(numpy.isfinite(maps[0]), footprint == 1))
            self.assert_same(maps[:, inside], self.expected[:, inside])

    def test_set_overrides_a_key(self):
        maps, _ = self.make("--set", 'unit="mK_RJ"', "--set", 'stokes="I"')
        self.assertEqual(maps.shape[0], 1)
        self.assert_same(maps[0], self.expected[0] * 1e3)
        done = self.foreglow("make", "study.toml", "--out", "other", "--set", "nsdie=64", status=2)
        self.assertIn("nside", done.stderr)  # the nearest known key
        self.assertFalse((self.folder / "other").exists())

    def test_a_full_folder_is_refused_without_replace(self):
        self.make()
        (self.folder / "out/mine.txt").write_text("a person's note")
        before = (self.folder / "out/maps/a.fits").read_bytes()
        done = self.foreglow("make", "study.toml", "--out", "out", status=2)
        self.assertIn("--replace", done.stderr)
        self.assertEqual((self.folder / "out/maps/a.fits").read_bytes(), before)
        self.make("--replace", extra='ordering = "nested"')
        self.assertNotEqual((self.folder / "out/maps/a.fits").read_bytes(), before)
        (self.folder / "empty").mkdir()
        self.make(out="empty")

    def test_default_folder(self):
        self.foreglow("make", "study.toml", "--quiet")
        self.assertTrue((self.folder / "study-out/maps/a.fits").is_file())
        self.assertTrue((self.folder / "study-out/run.json").is_file())
        self.assertTrue((self.folder / "study-out/report.html").is_file())

    def test_without_a_file(self):
        self.foreglow("make", "--model", "model.toml", "--frequency", "1 GHz", "--frequency", "2 GHz", "--nside", "32",
                      "--unit", "uK_RJ", "--out", "out", "--quiet")
        found = sorted((self.folder / "out/maps").glob("*.fits"))
        self.assertEqual(len(found), 2)
        for path in found:
            maps, header = harness.read_maps(path)
            factor = 1e6 * (header["FREQ"] / 408e6) ** -2.9
            # float32 by default: rounding to 6e-8 of each pixel
            numpy.testing.assert_allclose(maps[0], self.sky["I"] * factor, rtol=1.2e-7)

    def test_bundled_model_is_the_same_sky_at_each_nside_and_differs_by_seed(self):
        def means(nside, seed):
            out = f"out-{nside}-{seed}"
            self.foreglow("make", "--model", "quick-sketch", "--frequency", "408 MHz", "--nside", nside, "--out", out,
                          "--quiet", "--set", f"seed={seed}")
            path, = (self.folder / out / "maps").glob("*.fits")
            return healpy.ud_grade(harness.read_maps(path)[0][0], 8)
        coarse, fine, = means(32, 1), means(64, 1)
        self.assertTrue(numpy.all(coarse > 0))
        # Means over 7-degree cells of one continuous sky sampled at 16 and at 64 points; it is smooth at that scale but
        # for the plane and the loops' edges.
        self.assertLess(numpy.std(fine / coarse - 1), 0.03)

    def test_plan_tells_and_leaves_nothing(self):
        before = sorted(self.folder.rglob("*"))
        done = self.foreglow("plan", "study.toml")
        self.assertEqual(sorted(self.folder.rglob("*")), before)
        for word in ("a.fits", "output", "memory", "time"):
            self.assertIn(word, done.stdout.lower())

    def test_plan_refuses_what_make_refuses(self):
        self.write("study.toml", STUDY.format(extra="nsde = 3"))
        self.foreglow("plan", "study.toml", status=2)

    def test_progress_is_plain_in_a_log_and_silent_when_quiet(self):
        loud = self.foreglow("make", "study.toml", "--out", "loud")
        self.assertNotIn("\r", loud.stderr)
        self.assertNotIn("\x1b", loud.stderr)
        self.assertTrue(loud.stderr.strip())
        quiet = self.foreglow("make", "study.toml", "--out", "quiet", "--quiet")
        self.assertEqual(quiet.stderr, "")

    def test_realizations_have_their_names_and_the_first_is_the_single_run(self):
        self.foreglow("make", "--model", "quick-sketch", "--frequency", "1 GHz", "--nside", "16", "--out", "one", "--quiet")
        single, = (self.folder / "one/maps").glob("*.fits")
        self.foreglow("make", "--model", "quick-sketch", "--frequency", "1 GHz", "--nside", "16", "--out", "two", "--quiet",
                      "--set", "realizations=2")
        first = self.folder / f"two/maps/{single.stem}_r0000.fits"
        second = self.folder / f"two/maps/{single.stem}_r0001.fits"
        numpy.testing.assert_array_equal(harness.read_maps(first)[0], harness.read_maps(single)[0])
        self.assertEqual(harness.read_maps(second)[1]["REALIZ"], 1)

    def test_help_and_version(self):
        for arguments in (["--help"], ["make", "--help"], ["plan", "--help"]):
            self.assertIn("study", self.foreglow(*arguments).stdout.lower())
        self.assertRegex(self.foreglow("--version").stdout, r"\d+\.\d+\.\d+")
        self.assertTrue(self.foreglow("nonsense", status=2).stderr)
        self.assertTrue(self.foreglow("make", "absent.toml", status=2).stderr)

    def test_start_writes_a_study_that_runs(self):
        done = self.foreglow("start")
        study = self.folder / "from-start.toml"
        if done.stdout.strip().startswith(("#", "title")):
            study.write_text(done.stdout)
        else:
            study, = [p for p in self.folder.glob("*.toml") if p.name not in ("model.toml", "study.toml")]
        self.foreglow("make", study, "--out", "out", "--quiet", "--set", "nside=16", "--set", "lmax=32")

    def test_a_signal_leaves_no_half_file(self):
        for which, status in ((signal.SIGINT, 130), (signal.SIGTERM, 143)):
            with self.subTest(signal=which):
                out = self.folder / f"out{status}"
                channels = "".join(f'[[channel]]\nname = "c{n}"\nfrequency = "{n + 20} GHz"\nbeam_fwhm = "1 deg"\n'
                                   for n in range(40))
                self.write("long.toml", 'model = "model.toml"\nnside = 512\nstokes = "IQU"\n' + channels)
                process = subprocess.Popen([sys.modules["harness"].FOREGLOW, "make", "long.toml", "--out", out],
                                           cwd=self.folder, stderr=subprocess.PIPE, stdout=subprocess.DEVNULL, text=True,
                                           env=harness.command_environment())
                deadline = time.monotonic() + 120
                while time.monotonic() < deadline and process.poll() is None and not any(out.rglob("maps/*.fits*")):
                    time.sleep(0.02)
                self.assertIsNone(process.poll(), "the run ended before it could be stopped")
                process.send_signal(which)
                _, stderr = process.communicate(timeout=60)
                self.assertEqual(process.returncode, status, stderr)
                self.assertNotIn("terminate called", stderr)
                self.assertFalse(list(out.rglob("*.part")))
                self.assertFalse((out / "run.json").exists())  # the manifest comes last, so there is none
                for path in out.rglob("*.fits"):  # what stands is whole
                    done = subprocess.run(["fitsverify", "-q", path], capture_output=True, text=True)
                    self.assertIn("OK", done.stdout)

    def test_a_closed_pipe_is_no_failure(self):
        process = subprocess.Popen([sys.modules["harness"].FOREGLOW, "models"], cwd=self.folder, stdout=subprocess.PIPE,
                                   stderr=subprocess.PIPE, env=harness.command_environment())
        process.stdout.close()
        stderr = process.stderr.read()
        self.assertEqual(process.wait(), 0, stderr)
        process.stderr.close()

    def test_manifest_lists_what_is_there(self):
        self.make()
        manifest = json.loads((self.folder / "out/run.json").read_text())
        text = json.dumps(manifest)
        for path in (self.folder / "out").rglob("*"):
            if path.is_file() and path.name != "run.json":
                self.assertIn(str(path.relative_to(self.folder / "out")), text)


if __name__ == "__main__":
    harness.main()
