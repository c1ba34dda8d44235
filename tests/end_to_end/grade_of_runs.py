#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""`foreglow grade`: the floor against numpy.linalg.lstsq, pixel by pixel, and recovered maps against numbers by numpy and healpy."""

import csv
import json

import healpy
import numpy

import harness
import study_oracle

NSIDE = 16
TILT = -2.7
CHANNELS = [("a", 50e6, 12e6, None), ("b", 75e6, None, None), ("c", 110e6, None, "band.csv"), ("d", 160e6, 20e6, None),
            ("e", 240e6, None, None), ("f", 350e6, 90e6, None)]
NOISE = [("4", "mK_CMB", "deg"), ("3", "K_RJ", "arcmin"), ("2.5", "MJy/sr", "arcsec"), ("2", "K_CMB", "arcmin"), ("0.2", "K_RJ", "deg"),
         ("100", "mK_RJ", "arcmin")]
ANGLES = {"deg": 1.0, "arcmin": 1 / 60, "arcsec": 1 / 3600}


def fit_by_numpy(y, x, sigma_y, terms, linear):
    """Returns y - fit of each pixel [channels][npix] by numpy.linalg.lstsq of the weighted design."""
    design = numpy.stack([x ** j for j in range(terms)], axis=1)
    values = y if linear else numpy.log(y)
    fits = numpy.empty_like(y)
    for p in range(y.shape[1]):
        weight = numpy.ones(len(x))
        if sigma_y is not None:
            weight = 1 / sigma_y if linear else y[:, p] / sigma_y
        solution = numpy.linalg.lstsq(design * weight[:, None], values[:, p] * weight, rcond=None)[0]
        fits[:, p] = design @ solution
    return y - (fits if linear else numpy.exp(fits))


class GradeCase(harness.Case):
    def setUp(self):
        super().setUp()
        self.sky = harness.make_sky(NSIDE, seed=6)
        self.write_map("sky.fits", [self.sky["I"], self.sky["Q"], self.sky["U"]], unit="K_RJ", convention="COSMO")
        self.write_map("index.fits", [self.sky["index"]])
        self.write_map("curvature.fits", [self.sky["curvature"]])
        self.write("model.toml", 'reference_frequency = "120 MHz"\n[intensity]\nmap = "sky.fits"\n[polarization]\nmap = "sky.fits"\n'
                   'columns = [2, 3]\n[index]\nmap = "index.fits"\n[curvature]\nmap = "curvature.fits"\n')
        self.write("band.csv", "frequency_MHz,transmission\n95,0\n105,1\n112,0.8\n128,0\n")

    def study(self, noise=False, unit="K_CMB", beams=None, top=""):
        text = f'model = "model.toml"\nnside = {NSIDE}\nunit = "{unit}"\nprecision = "float64"\n{top}'
        for number, (name, nu, width, table) in enumerate(CHANNELS):
            text += f'[[channel]]\nname = "{name}"\nfrequency = "{nu / 1e6} MHz"\n'
            text += f'bandwidth = "{width / 1e6} MHz"\n' if width else ""
            text += f'response = "{table}"\nresponse_weights = "radiance"\n' if table else ""
            text += f'noise = "{" ".join(NOISE[number])}"\n' if noise else ""
            text += f'beam_fwhm = "{beams[number]} deg"\n' if beams else ""
        return self.write("study.toml", text)

    def make(self, **options):
        self.study(**options)
        self.foreglow("make", "study.toml", "--out", "run", "--quiet", "--replace")
        return numpy.array([harness.read_maps(self.folder / f"run/maps/{c[0]}.fits")[0][0] for c in CHANNELS])

    def grade(self, *arguments):
        done = self.foreglow("grade", *arguments, "--format", "json", "--quiet")
        return json.loads(done.stdout)

    def band_value(self, number, unit, law):
        """Returns what a channel makes of a spectrum T_RJ(nu), by the oracle's own bands."""
        name, nu, width, table = CHANNELS[number]
        channel = {"frequency": f"{nu / 1e6} MHz"}
        if width:
            channel["bandwidth"] = f"{width / 1e6} MHz"
        if table:
            channel |= {"response": table, "response_weights": "radiance"}
        band, reference, flux_index = study_oracle.channel_response(channel, {}, self.folder)
        return float(band.average(law, unit, reference, flux_index, healpy.nside2npix(NSIDE)))


class Floor(GradeCase):
    def expected(self, maps, unit, terms, linear, noise):
        nu = numpy.array([c[1] for c in CHANNELS])
        reference = numpy.exp(numpy.mean(numpy.log(nu)))
        x = numpy.log(nu / reference)
        response = numpy.array([self.band_value(i, unit, lambda f: (f / reference) ** TILT) for i in range(len(nu))])
        sigma = None
        if noise:
            sigma = []
            for number, (value, own, angle) in enumerate(NOISE):
                # The same sky in both units tells what one is in the other.
                factor = response[number] / self.band_value(number, own, lambda f: (f / reference) ** TILT)
                pixel = numpy.degrees(healpy.nside2resol(NSIDE))
                sigma.append(float(value) * ANGLES[angle] / pixel * factor)
            sigma = numpy.array(sigma) / response
        y = maps / response[:, None]
        return fit_by_numpy(y, x, sigma, terms, linear) * response[:, None], x, response

    def test_against_lstsq(self):
        for noise, linear, terms in ((False, False, 3), (True, False, 2), (True, True, 3), (False, True, 4)):
            with self.subTest(noise=noise, linear=linear, terms=terms):
                maps = self.make(noise=noise)
                rows = self.grade("run", "--terms", terms, "--fit", "linear" if linear else "log", "--replace")
                self.assertEqual(len(rows), terms * len(CHANNELS))
                for k in range(1, terms + 1):
                    expected, x, response = self.expected(maps, "K_CMB", k, linear, noise)
                    for number, row in enumerate(rows[(k - 1) * len(CHANNELS):k * len(CHANNELS)]):
                        self.assertEqual((row["channel"], row["terms"], row["unit"]), (CHANNELS[number][0], k, "K_CMB"))
                        self.assertEqual(row["pixels"], maps.shape[1])
                        want = expected[number]
                        rms = numpy.sqrt(numpy.mean(want ** 2))
                        # The 1e-6 of each number; the mean may be small against the rms, so of that.
                        self.assertAlmostEqual(row["rms"] / rms, 1, delta=1e-6)
                        self.assertAlmostEqual(row["mean"] / rms, numpy.mean(want) / rms, delta=1e-6)
                        self.assertAlmostEqual(row["p95"] / numpy.percentile(numpy.abs(want), 95), 1, delta=1e-6)
                        self.assertAlmostEqual(row["rms_K_RJ"] / (rms / response[number] * numpy.exp(TILT * x[number])), 1,
                                               delta=1e-6)
                for number, (name, *_) in enumerate(CHANNELS):
                    (residual,), header = harness.read_maps(self.folder / f"run/grade/{name}.fits")
                    rms = numpy.sqrt(numpy.mean(expected[number] ** 2))
                    self.assertLess(numpy.max(numpy.abs(residual - expected[number])), 1e-6 * rms)
                    self.assertEqual((header["TERMS"], header["TUNIT1"].strip()), (terms, "K_CMB"))

    def test_pixels_without_a_logarithm(self):
        self.sky["I"][:40] *= -1
        self.sky["I"][40:50] = healpy.UNSEEN
        self.write_map("sky.fits", [self.sky["I"], self.sky["Q"], self.sky["U"]], unit="K_RJ", convention="COSMO")
        self.make()
        done = self.foreglow("grade", "run", "--terms", "amplitude+index", "--format", "csv")
        self.assertRegex(done.stderr, "10 are undefined in a channel, 40 are not positive")
        rows = list(csv.DictReader(done.stdout.splitlines()))
        self.assertEqual({row["terms"] for row in rows}, {"1", "2"})
        self.assertEqual({int(row["pixels"]) for row in rows}, {12 * NSIDE ** 2 - 50})
        (residual,), _ = harness.read_maps(self.folder / "run/grade/a.fits")
        self.assertEqual(numpy.flatnonzero(numpy.isnan(residual)).tolist(), list(range(50)))
        rows = self.grade("run", "--terms", "2", "--fit", "linear", "--replace")
        self.assertEqual({row["pixels"] for row in rows}, {12 * NSIDE ** 2 - 10})

    def test_mask_and_spectrum(self):
        self.make()
        mask = (numpy.arange(12 * NSIDE ** 2) % 7 < 3).astype(float)
        self.write_map("mask.fits", [mask])
        rows = self.grade("run", "--mask", "mask.fits", "--terms", "2")
        self.assertEqual(rows[0]["pixels"], int(mask.sum()))
        (residual,), _ = harness.read_maps(self.folder / "run/grade/a.fits")
        self.assertAlmostEqual(rows[6]["rms"], numpy.sqrt(numpy.mean(residual[mask > 0] ** 2)), delta=1e-9 * rows[6]["rms"])
        with open(self.folder / "run/grade/spectra.csv", encoding="ascii") as file:
            found = numpy.array([float(r["residual_cl"]) for r in csv.DictReader(file) if r["map"] == "a"])
        cut = (residual - numpy.mean(residual[mask > 0])) * mask
        expected = healpy.anafast(cut, lmax=2 * NSIDE, iter=12) / numpy.mean(mask)
        # What is promised of one refinement; l = 0 holds what the subtracted mean leaves, nothing.
        numpy.testing.assert_allclose(found[1:], expected[1:], rtol=1e-3)
        self.assertLess(found[0], 1e-6 * expected.max())

    def test_study_alone_is_its_run(self):
        self.make(noise=True)
        run = self.grade("run")
        study = self.grade("study.toml")  # nside 16 is coarser than the usual 64, so it stays
        for a, b in zip(run, study):
            self.assertEqual((a["channel"], a["terms"], a["pixels"]), (b["channel"], b["terms"], b["pixels"]))
            # Both sides are float64 maps of the same law; overrides of accuracy or files change nothing here.
            self.assertAlmostEqual(a["rms"], b["rms"], delta=1e-6 * a["rms"])
        self.assertFalse((self.folder / "study-out").exists())
        done = self.foreglow("grade", "study.toml", "--nside", "8")
        self.assertIn("graded at nside 8", done.stderr)

    def test_chromatic_beams_count_unless_common(self):
        beams = [14 * 50e6 / c[1] + 6 for c in CHANNELS]
        self.make(beams=beams)
        chromatic = self.grade("run", "--terms", "3")
        common = self.grade("run", "--terms", "3", "--common-beam", "20 deg", "--replace")
        ratio = [a["rms"] / b["rms"] for a, b in zip(common[12:], chromatic[12:])]
        self.assertLess(max(ratio), 0.5)  # 0.04 to 0.45 here: a beam that grows by 4 over the channels is no smooth spectrum
        # The deconvolved run and the study made with the common beam are one sky: their floors agree to what the transforms
        # of nside 16 with an accuracy of 1e-5 leave of the map, against a floor of some 1e-3 of it.
        study = self.grade("study.toml", "--terms", "3", "--common-beam", "20 deg")
        for a, b in zip(common[:12], study[:12]):
            self.assertAlmostEqual(a["rms"] / b["rms"], 1, delta=0.02)
        done = self.foreglow("grade", "run", "--common-beam", "10 deg", "--replace", status=2)
        self.assertIn("wider beam", done.stderr)

    def test_a_moved_run_asks_for_its_tables(self):
        self.make()
        (self.folder / "elsewhere").mkdir()
        (self.folder / "run").rename(self.folder / "elsewhere/run")
        done = self.foreglow("grade", "elsewhere/run", status=2)
        self.assertIn("--study", done.stderr)
        rows = self.grade("elsewhere/run", "--study", "study.toml")
        self.assertEqual(len(rows), 18)
        self.write("band.csv", "frequency_MHz,transmission\n95,1\n128,1\n")
        done = self.foreglow("grade", "elsewhere/run", "--study", "study.toml", "--replace", status=2)
        self.assertIn("other content", done.stderr)


class RecoveredMaps(GradeCase):
    def test_channels(self):
        self.study(top='stokes = "IQU"\n', unit="mK_RJ")
        self.foreglow("make", "study.toml", "--out", "run", "--quiet")
        truth, _ = harness.read_maps(self.folder / "run/maps/c.fits")
        random = numpy.random.default_rng(2)
        error = random.standard_normal(truth.shape) * [[3.0], [1.0], [2.0]] + [[0.5], [0.0], [0.0]]
        recovered = truth + error
        recovered[:, 77] = numpy.nan
        (self.folder / "found").mkdir()
        self.write_map("found/c.fits", recovered / 1000, unit="K_RJ", convention="COSMO", nested=True)  # another scale, another order
        rows = self.grade("run", "found", "--cut", "0", "--cut", "25")
        good = numpy.arange(truth.shape[1]) != 77
        latitude = 90 - numpy.degrees(healpy.pix2ang(NSIDE, numpy.arange(truth.shape[1]))[0])
        whole = [r for r in rows if r["l_low"] is None]
        self.assertEqual([(r["map"], r["column"], r["cut_deg"]) for r in whole],
                         [("c", s, cut) for s in ("I_STOKES", "Q_STOKES", "U_STOKES") for cut in (0, 25)])
        for row, (stokes, cut) in zip(whole, ((s, c) for s in range(3) for c in (0, 25))):
            keep = good & (numpy.abs(latitude) >= cut)
            values = error[stokes][keep]
            self.assertEqual((row["pixels"], row["unit"]), (keep.sum(), "mK_RJ"))
            size = numpy.abs(truth).max() * 1e-12  # rounding of a difference of doubles
            self.assertAlmostEqual(row["mean"], numpy.mean(values), delta=size)
            self.assertAlmostEqual(row["rms"], numpy.sqrt(numpy.mean(values ** 2)), delta=size)
            for key, share in (("p5", 5), ("p50", 50), ("p95", 95)):
                self.assertAlmostEqual(row[key], numpy.percentile(values, share), delta=size)
            self.assertAlmostEqual(row["ratio"], row["rms"] / row["truth_rms"], delta=1e-12)
        bands = [r for r in rows if r["l_low"] is not None and r["column"] == "I_STOKES" and r["cut_deg"] == 25]
        self.assertEqual([(b["l_low"], b["l_high"]) for b in bands], [(2, 10), (11, 30), (31, 32)])
        keep = good & (numpy.abs(latitude) >= 25)
        cl = healpy.anafast(numpy.where(keep, error[0] - numpy.mean(error[0][keep]), 0.0), lmax=32, iter=12) / numpy.mean(keep)
        ell = numpy.arange(33)
        for band in bands:
            here = (ell >= band["l_low"]) & (ell <= band["l_high"])
            self.assertAlmostEqual(band["rms"], numpy.sqrt(numpy.sum((2 * ell + 1)[here] * cl[here]) / 4 / numpy.pi), delta=1e-3 * band["rms"])

    def test_index_against_the_beam_smoothed_truth(self):
        self.make()
        frequency, fwhm = 200e6, 15.0
        lmax = 2 * NSIDE

        def smooth(values):
            alm = healpy.map2alm(values, lmax=lmax, iter=12)
            return healpy.alm2map(healpy.almxfl(alm, healpy.gauss_beam(numpy.radians(fwhm), lmax)), NSIDE, lmax=lmax)

        def brightness(nu):
            x = numpy.log(nu / 120e6)
            return self.sky["I"] * numpy.exp((self.sky["index"] + self.sky["curvature"] * x) * x)
        # What a perfect recovery finds: the smoothed skies beside the frequency, differenced; steps of 2 % cost (0.02)^2/6 of
        # the third derivative, below 1e-6 of the index.
        step = 0.02
        logs = [numpy.log(smooth(brightness(frequency * numpy.exp(s)))) for s in (-step, 0, step)]
        index = (logs[2] - logs[0]) / (2 * step)
        curvature = (logs[2] - 2 * logs[1] + logs[0]) / (2 * step ** 2)
        for name, values, unit in (("index", index, None), ("curvature", curvature, None), ("amplitude", numpy.exp(logs[1]), "K_RJ")):
            path = self.write_map(f"{name}_found.fits", [values], unit=unit)
            with harness.fits.open(path, mode="update") as file:
                file[1].header["FREQ"] = frequency
                file[1].header["BEAMFWHM"] = fwhm
            (self.folder / "found").mkdir(exist_ok=True)
            path.rename(self.folder / f"found/{name}.fits")
        rows = {r["map"]: r for r in self.grade("run", "found", "--cut", "0") if r["l_low"] is None}
        self.assertLess(rows["index"]["rms"], 2e-5)
        self.assertLess(rows["curvature"]["rms"], 2e-4)  # a second difference of 2 %: (0.02)^2 of the fourth derivative, and rounding
        self.assertLess(rows["amplitude"]["ratio"], 1e-6)
        # The sky before the beam has another index by far more than that.
        self.write_map("found/index.fits", [self.sky["index"] + 2 * self.sky["curvature"] * numpy.log(frequency / 120e6)])
        with harness.fits.open(self.folder / "found/index.fits", mode="update") as file:
            file[1].header["FREQ"] = frequency
            file[1].header["BEAMFWHM"] = fwhm
        rows = {r["map"]: r for r in self.grade("run", "found/index.fits", "--cut", "0", "--replace") if r["l_low"] is None}
        self.assertGreater(rows["index"]["rms"], 0.02)


class Requests(GradeCase):
    def test_impossible_ones_are_refused(self):
        self.make()
        self.write_map("coarse.fits", [numpy.ones(12)], unit="K_CMB")
        (self.folder / "found").mkdir()
        self.write_map("found/a.fits", [numpy.ones(12)], unit="K_CMB")
        self.write_map("zero.fits", [numpy.zeros(12)])
        self.write_map("b.fits", [numpy.ones(12 * NSIDE ** 2)], unit="K_RJ")
        self.write_map("c.fits", [numpy.ones(12 * NSIDE ** 2)], unit="K_CMB", frame="C")
        (self.folder / "empty").mkdir()
        for words, message in ((["nothing"], "does not exist"), (["empty"], "no run.json"), (["run", "--terms", "6"], "at most 5"),
                               (["run", "--terms", "0"], "whole number"), (["run", "--terms", "amplitude+indx"], "whole number"),
                               (["run", "coarse.fits"], "no map of that name"), (["run", "found"], "nside 1"),
                               (["run", "b.fits"], "is in 'K_RJ'"), (["run", "c.fits"], "frame"), (["run", "empty"], "no .fits"),
                               (["study.toml", "b.fits"], "finished run"), (["run", "--mask", "zero.fits"], "keeps no pixel"),
                               (["run", "--nside", "12"], "power of two"), (["run", "--nside", "64"], "finer"),
                               (["run", "--common-beam", "5"], "--common-beam"), (["run", "--fit", "cubic"], "log, linear"),
                               (["run", "b.fits", "--cut", "90"], "90 degrees")):
            with self.subTest(words=words):
                done = self.foreglow("grade", *words, "--quiet", status=2)
                self.assertIn(message, done.stderr)
                self.assertEqual(len(done.stderr.strip().splitlines()), 1, done.stderr)
                self.assertFalse((self.folder / "run/grade").exists())
        self.study(noise=True)
        text = (self.folder / "study.toml").read_text().replace('noise = "4 mK_CMB deg"\n', "")
        self.write("study.toml", text)
        done = self.foreglow("grade", "study.toml", "--quiet", status=2)
        self.assertIn("channel a has no noise", done.stderr)

    def test_does_not_overwrite_unasked(self):
        self.make()
        self.grade("run")
        before = (self.folder / "run/grade/rows.csv").read_text()
        done = self.foreglow("grade", "run", status=2)
        self.assertIn("--replace", done.stderr)
        self.assertEqual((self.folder / "run/grade/rows.csv").read_text(), before)


if __name__ == "__main__":
    harness.main()
