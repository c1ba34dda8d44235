#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""`foreglow index` on surveys that numpy and healpy make from a known truth, and on real maps of the sky.

A pull is (answer - truth)/quoted error. Over N pixels its variance is known to sqrt(2/N), and the mean of answer - truth to the
error over sqrt(N); maps that were smoothed have fewer independent pixels than that, and where it matters the tests count them so.
"""

import csv
import json

import healpy
import numpy

import harness
import real_maps
import study_oracle

REFERENCE = 1.0e9


def power_law(amplitude, index, curvature, frequency):
    x = numpy.log(frequency / REFERENCE)
    return amplitude * numpy.exp((index + curvature * x) * x)


def rms(values):
    return numpy.sqrt(numpy.nanmean(numpy.square(values)))


def read_csv(path):
    """Returns scatter.csv as rows of numbers, NaN where a cell is empty."""
    with open(path, encoding="ascii") as file:
        return [{k: v if k == "frame" else float(v) if v else numpy.nan for k, v in row.items()}
                for row in csv.DictReader(file)]


class IndexCase(harness.Case):
    def surveys(self, top, entries):
        text = 'reference_frequency = "1 GHz"\n' + top + "\n"
        for entry in entries:
            text += "[[survey]]\n" + "".join(f"{k} = {json.dumps(v)}\n" for k, v in entry.items())
        return self.write("surveys.toml", text)

    def index(self, *options, out="out"):
        done = self.foreglow("index", "surveys.toml", "--out", out, "--quiet", "--format", "json", *options)
        maps, header = harness.read_maps(self.folder / out / "index.fits")
        amplitude, _ = harness.read_maps(self.folder / out / "amplitude.fits")
        run = json.loads((self.folder / out / "run.json").read_text())
        return {"index": maps, "amplitude": amplitude, "header": header, "run": run, "rows": json.loads(done.stdout),
                "scatter": read_csv(self.folder / out / "scatter.csv")}

    def check_pulls(self, values, errors, truth, independent=1.0, context=""):
        """Bias below a tenth of the quoted error, pulls of variance 0.9 to 1.1 (the issue's own numbers)."""
        good = ~numpy.isnan(values)
        pulls = (values[good] - truth[good]) / errors[good]
        # The numbers asked for must be able to fail: what chance gives is well below them.
        self.assertLess(5 / numpy.sqrt(good.sum() * independent), 0.1)
        # (The mean of the pulls is no bias: a pixel that noise made faint quotes a larger error.)
        self.assertLess(abs(numpy.mean((values - truth)[good])), 0.1 * numpy.mean(errors[good]), context)
        self.assertGreater(numpy.var(pulls), 0.9, context)
        self.assertLess(numpy.var(pulls), 1.1, context)
        return good


class Pulls(IndexCase):
    """nside 128, 196 608 pixels, all surveys already at the common resolution: each pixel is a draw of its own."""

    NSIDE = 128

    def make_surveys(self, frequencies, signal_to_noise, curvature=False, seed=3):
        sky = harness.make_sky(self.NSIDE, seed=1)
        random = numpy.random.default_rng(seed)
        curve = sky["curvature"] if curvature else 0.0
        entries = []
        for number, (frequency, ratio) in enumerate(zip(frequencies, signal_to_noise)):
            clean = power_law(sky["I"], sky["index"], curve, frequency)
            noise = numpy.median(clean) / ratio
            name = f"survey{number}.fits"
            self.write_map(name, [clean + noise * random.standard_normal(clean.size)], unit="K_RJ")
            entries.append({"map": name, "frequency": f"{frequency / 1e6:.17g} MHz", "beam_fwhm": "1 deg",
                            "noise": f"{noise:.17g} K_RJ"})
        self.surveys(f'nside = {self.NSIDE}\nbeam_fwhm = "1 deg"\ncurvature = {str(curvature).lower()}', entries)
        return sky, entries

    def test_two_surveys_in_log_space(self):
        sky, _ = self.make_surveys([408e6, 2.3e9], [100, 60])
        answer = self.index()
        good = self.check_pulls(*answer["index"][:2], sky["index"])
        self.check_pulls(*answer["amplitude"][:2], sky["I"])
        self.assertTrue(numpy.all(good))
        self.assertEqual(answer["run"]["pixels"]["in_linear_space"], 0)
        self.assertEqual(answer["header"]["COORDSYS"].strip(), "G")

    def test_three_surveys_at_low_signal_to_noise(self):
        # Near a brightness of 7 sigma at each frequency, half of the pixels below: all in linear space.
        sky, _ = self.make_surveys([408e6, 1.42e9, 2.3e9], [12, 9, 9])
        answer = self.index()
        good = self.check_pulls(*answer["index"][:2], sky["index"])
        self.check_pulls(*answer["amplitude"][:2], sky["I"])
        self.assertGreater(answer["run"]["pixels"]["in_linear_space"], 0.5 * good.size)
        # The quoted error is that of an independent sum over the design: check it where truth gives it.
        self.assertGreater(numpy.mean(good), 0.99)

    def test_curvature_from_four_surveys(self):
        sky, _ = self.make_surveys([150e6, 408e6, 1.42e9, 5e9], [120, 100, 80, 60], curvature=True)
        answer = self.index()
        self.check_pulls(answer["index"][0], answer["index"][1], sky["index"])
        self.check_pulls(answer["index"][2], answer["index"][3], sky["curvature"])
        self.check_pulls(*answer["amplitude"][:2], sky["I"])

    def test_high_signal_against_lstsq(self):
        # At 1e5 sigma a logarithm is straight: numpy.linalg.lstsq with the weights T/sigma gives the same numbers.
        frequencies = [150e6, 408e6, 1.42e9]
        sky, entries = self.make_surveys(frequencies, [1e5, 1e5, 1e5], curvature=False)
        answer = self.index()
        maps = numpy.array([harness.read_maps(self.folder / e["map"])[0][0] for e in entries])
        noise = [float(e["noise"].split()[0]) for e in entries]
        x = numpy.log(numpy.array(frequencies) / REFERENCE)
        for pixel in range(0, maps.shape[1], 9973):
            weights = maps[:, pixel] / noise
            design = numpy.stack([numpy.ones(3), x], axis=1) * weights[:, None]
            solution = numpy.linalg.lstsq(design, numpy.log(maps[:, pixel]) * weights, rcond=None)[0]
            covariance = numpy.linalg.inv(design.T @ design)
            # Files are float32: 6e-8 of the value; weights from the fit in place of the data, 1e-5 of 1e-5.
            self.assertAlmostEqual(answer["index"][0, pixel] / solution[1], 1, delta=2e-7)
            self.assertAlmostEqual(answer["amplitude"][0, pixel] / numpy.exp(solution[0]), 1, delta=2e-7)
            self.assertAlmostEqual(answer["index"][1, pixel] / numpy.sqrt(covariance[1, 1]), 1, delta=1e-4)

    def test_common_errors(self):
        # 400 skies of one pixel ring (nside 1: 12 pixels) would be slow as files; errors are linear, so one run on
        # shifted surveys and the quoted error of a survey with zero level and gain errors tell the same.
        frequencies, zero, gain = [408e6, 2.3e9], [1.0, 0.02], [0.05, 0.03]
        sky, entries = self.make_surveys(frequencies, [1e6, 1e6])
        for entry, z, g in zip(entries, zero, gain):
            entry.update(zero_level_error=f"{z} K_RJ", calibration_error=g)
        top = f'nside = {self.NSIDE}\nbeam_fwhm = "1 deg"'
        self.surveys(top, entries)
        answer = self.index()
        clean = [power_law(sky["I"], sky["index"], 0, f) for f in frequencies]
        relative = [numpy.hypot(z / t, g) for z, t, g in zip(zero, clean, gain)]
        expected = numpy.hypot(*relative) / numpy.log(frequencies[1] / frequencies[0])
        good = ~numpy.isnan(answer["index"][0])
        numpy.testing.assert_allclose(answer["index"][1][good], expected[good], rtol=1e-4)  # noise is 1e-6 of T
        noise_only = self.index("--errors", "noise", out="noise")
        numpy.testing.assert_array_equal(noise_only["index"][0], answer["index"][0])
        self.assertLess(numpy.nanmax(noise_only["index"][1]), 1e-4)
        # A survey that is off by its zero-level error moves the index by that part of the error, to first order.
        shifted, = harness.read_maps(self.folder / entries[0]["map"])[0]
        self.write_map("shifted.fits", [shifted + zero[0]], unit="K_RJ")
        self.surveys(top, [{**entries[0], "map": "shifted.fits"}, entries[1]])
        moved = self.index(out="moved")["index"][0] - answer["index"][0]
        part = numpy.log1p(zero[0] / clean[0]) / numpy.log(frequencies[1] / frequencies[0])
        numpy.testing.assert_allclose(moved[good], -part[good], atol=2e-6)  # float32 of an index near 3 is 2.4e-7

    def test_undefined_says_why(self):
        sky, entries = self.make_surveys([408e6, 2.3e9], [100, 60])
        first, = harness.read_maps(self.folder / entries[0]["map"])[0]
        second, = harness.read_maps(self.folder / entries[1]["map"])[0]
        first[:100] = healpy.UNSEEN
        second[100:250] = -1.0
        second[250:400] = float(entries[1]["noise"].split()[0])  # one sigma
        self.write_map("low.fits", [first], unit="K_RJ")
        self.write_map("high.fits", [second], unit="K_RJ")
        self.surveys(f'nside = {self.NSIDE}\nbeam_fwhm = "1 deg"',
                     [{**entries[0], "map": "low.fits"}, {**entries[1], "map": "high.fits"}])
        done = self.foreglow("index", "surveys.toml", "--out", "out")
        maps, _ = harness.read_maps(self.folder / "out/index.fits")
        self.assertTrue(numpy.all(numpy.isnan(maps[:, :400])))
        self.assertFalse(numpy.any(numpy.isnan(maps[:, 400:])))
        pixels = json.loads((self.folder / "out/run.json").read_text())["pixels"]
        self.assertEqual((pixels["undefined_too_few_surveys"], pixels["undefined_not_positive"],
                          pixels["undefined_too_uncertain"]), (100, 150, 150))
        self.assertIn("400 of 196608 pixels are undefined", done.stderr)

    def test_is_a_model_s_index_map(self):
        sky, _ = self.make_surveys([408e6, 2.3e9], [1e5, 1e5])
        answer = self.index()
        self.write("model.toml", 'reference_frequency = "1 GHz"\n[intensity]\nmap = "out/amplitude.fits"\n'
                   '[index]\nmap = "out/index.fits"\n')
        self.write("study.toml", f'model = "model.toml"\nnside = {self.NSIDE}\nprecision = "float64"\n[[channel]]\nname = "a"\n'
                   'frequency = "2.3 GHz"\n')
        self.foreglow("make", "study.toml", "--out", "run", "--quiet")
        maps, _ = harness.read_maps(self.folder / "run/maps/a.fits")
        numpy.testing.assert_allclose(maps[0], power_law(*[answer[k][0] for k in ("amplitude", "index")], 0, 2.3e9),
                                      rtol=1e-9)  # an exp of a product below 3, in double
        numpy.testing.assert_allclose(maps[0], power_law(sky["I"], sky["index"], 0, 2.3e9), rtol=1e-3)  # 1e5 sigma


class Smoothing(IndexCase):
    """Surveys of different nside and beam, one nested and one in another unit, smoothed to 3 deg."""

    def make(self, noise_maps=False, seed=5):
        random = numpy.random.default_rng(seed)
        lmax = 120
        ell = numpy.arange(lmax + 1)
        sky = harness.make_sky(64, seed=2, lmax=60)
        # Beams act on brightness: the truth is the index between the smoothed skies.
        frequencies, nsides, beams = [408e6, 1.42e9, 2.3e9], [64, 128, 128], [1.0, 2.0, 2.5]
        entries, smooth = [], []
        for number, (frequency, nside, beam) in enumerate(zip(frequencies, nsides, beams)):
            brightness = power_law(sky["I"], sky["index"], 0.0, frequency)
            alm = healpy.map2alm(brightness, lmax=lmax, iter=10)
            own = healpy.gauss_beam(numpy.radians(beam), lmax)
            common = healpy.gauss_beam(numpy.radians(3.0), lmax)
            clean = healpy.alm2map(healpy.almxfl(alm, own), nside, lmax=lmax)
            smooth.append(healpy.alm2map(healpy.almxfl(alm, common), 64, lmax=lmax))
            level = numpy.median(clean) / 25
            if noise_maps:
                z = numpy.cos(healpy.pix2ang(nside, numpy.arange(clean.size))[0])
                level = level * (1.5 + z)
            observed = clean + level * random.standard_normal(clean.size)
            entry = {"map": f"s{number}.fits", "frequency": f"{frequency / 1e6:.17g} MHz", "beam_fwhm": f"{beam} deg"}
            unit = 1.0
            if number == 1:
                unit = study_oracle.thermodynamic_factor(frequency) * 1e-3  # K_RJ of one mK_CMB
            self.write_map(entry["map"], [observed / unit], unit="K_RJ" if number != 1 else "mK_CMB", nested=number == 2)
            if noise_maps:
                entry["noise_map"] = f"n{number}.fits"
                self.write_map(entry["noise_map"], [level / unit], unit="K_RJ" if number != 1 else "mK_CMB")
            else:
                entry["noise"] = f"{level / unit:.17g} {'K_RJ' if number != 1 else 'mK_CMB'}"
            entries.append(entry)
        self.surveys('nside = 64\nbeam_fwhm = "3 deg"', entries)
        # Of three powers of different beams a single law is not exact; two are.
        return entries, smooth, frequencies

    def test_pulls_after_smoothing(self):
        for noise_maps in (False, True):
            with self.subTest(noise_maps=noise_maps):
                entries, smooth, frequencies = self.make(noise_maps)
                self.surveys('nside = 64\nbeam_fwhm = "3 deg"', [entries[0], entries[2]])
                answer = self.index(out=f"out{noise_maps}")
                truth = numpy.log(smooth[2] / smooth[0]) / numpy.log(frequencies[2] / frequencies[0])
                # The first survey's kernel is 2.8 deg wide: its noise is one sample per 4 pi sigma^2 = 18 pixels of 0.84 deg2.
                self.check_pulls(*answer["index"][:2], truth, independent=1 / 18, context=str(noise_maps))

    def test_smoothing_without_noise(self):
        entries, smooth, frequencies = self.make()
        sky = harness.make_sky(64, seed=2, lmax=60)
        for number, (entry, frequency, nside) in enumerate(zip(entries, frequencies, [64, 128, 128])):
            alm = healpy.map2alm(power_law(sky["I"], sky["index"], 0.0, frequency), lmax=120, iter=10)
            beam = healpy.gauss_beam(numpy.radians(float(entry["beam_fwhm"].split()[0])), 120)
            self.write_map(f"c{number}.fits", [healpy.alm2map(healpy.almxfl(alm, beam), nside, lmax=120)], unit="K_RJ")
            entry.update(map=f"c{number}.fits", noise="1e-9 K_RJ")
        self.surveys('nside = 64\nbeam_fwhm = "3 deg"', [entries[0], entries[2]])
        answer = self.index()
        truth = numpy.log(smooth[2] / smooth[0]) / numpy.log(frequencies[2] / frequencies[0])
        # The sky has nothing above l = 120, where the common beam is at 3e-3: no cut is left but the a_lm's tolerance of 1e-6.
        self.assertLess(rms(answer["index"][0] - truth), 1e-5)

    def test_other_frames_and_masks(self):
        entries, _, _ = self.make()
        turn = healpy.Rotator(coord=["G", "C"])
        values, = harness.read_maps(self.folder / entries[2]["map"])[0]
        alm = turn.rotate_alm(healpy.map2alm(values, lmax=250, iter=10))
        turned = healpy.alm2map(alm, 128, lmax=250)
        self.write_map("icrs.fits", [turned], unit="K_RJ", frame="C")
        self.surveys('nside = 64\nbeam_fwhm = "3 deg"', [entries[0], entries[2]])
        plain = self.index(out="plain")
        self.surveys('nside = 64\nbeam_fwhm = "3 deg"', [entries[0], {**entries[2], "map": "icrs.fits"}])
        other = self.index(out="other")
        # The turned map is limited to l = 250 as the analysis is; noise between there and 320 is in one of them only.
        self.assertLess(rms(other["index"][0] - plain["index"][0]), 0.02 * numpy.mean(plain["index"][1]))
        masked, = harness.read_maps(self.folder / entries[0]["map"])[0]
        theta, _ = healpy.pix2ang(64, numpy.arange(masked.size))
        masked[theta < numpy.radians(20)] = healpy.UNSEEN
        self.write_map("masked.fits", [masked], unit="K_RJ")
        self.surveys('nside = 64\nbeam_fwhm = "3 deg"', [{**entries[0], "map": "masked.fits"}, entries[2]])
        answer = self.index(out="masked")
        self.assertTrue(numpy.all(numpy.isnan(answer["index"][0][theta < numpy.radians(20)])))
        self.assertFalse(numpy.any(numpy.isnan(answer["index"][0][theta > numpy.radians(26)])))  # two beams away
        far = theta > numpy.radians(30)
        numpy.testing.assert_allclose(answer["index"][0][far], plain["index"][0][far], atol=1e-3)


class Scatter(IndexCase):
    def test_real_maps(self):
        # Two real maps of one sky, which at these frequencies is the CMB: its index in Rayleigh-Jeans units is -0.294.
        low_path, low = real_maps.find("_V_v4_udgraded32_masked.fits")
        high_path, high = real_maps.find("_W_v4_udgraded32.fits")
        frequencies = [60.8e9, 93.5e9]
        factors = [study_oracle.thermodynamic_factor(f) for f in frequencies]
        ratio = numpy.log(frequencies[1] / frequencies[0])
        good = ~numpy.isnan(low[0])
        x, y = low[0][good], high[0][good]
        forward = numpy.cov(x, y)[0, 1] / numpy.var(x, ddof=1)
        expected = numpy.log(forward * factors[1] / factors[0]) / ratio
        self.assertAlmostEqual(forward, 1.007, delta=0.001)  # so numpy sees what the file is said to hold
        self.assertAlmostEqual(expected, -0.276, delta=0.003)

        def run(noises, out):
            entries = [{"map": str(path), "unit": "mK_CMB", "frame": "galactic", "frequency": f"{f / 1e9} GHz",
                        "beam_fwhm": "1 deg", "noise": f"{noise} mK_CMB"}
                       for path, f, noise in zip((low_path, high_path), frequencies, noises)]
            self.surveys('nside = 32\nbeam_fwhm = "1 deg"', entries)
            rows = self.index(out=out)["scatter"]
            self.assertEqual((rows[0]["nside"], rows[0]["pixels"]), (0, good.sum()))
            return rows[0]
        # All the noise in the second map: the regression of it on the first, numpy's number to rounding.
        row = run((0, 0.03), "forward")
        slope = row["slope"] * factors[0] / factors[1]
        self.assertAlmostEqual(slope, forward, delta=1e-9)
        self.assertAlmostEqual(row["index"], expected, delta=1e-9)
        self.assertAlmostEqual(row["index_forward"], expected, delta=1e-9)
        self.assertAlmostEqual(row["index"], -0.276, delta=0.003)
        # Noise in both: Deming's line, here from the eigenvector of the whitened covariance.
        row = run((0.02, 0.03), "both")
        noise = numpy.array([0.02 * factors[0], 0.03 * factors[1]])
        covariance = numpy.cov(x * factors[0], y * factors[1]) / numpy.outer(noise, noise)
        vector = numpy.linalg.eigh(covariance)[1][:, 1]
        deming = vector[1] / vector[0] * noise[1] / noise[0]
        self.assertAlmostEqual(row["slope"], deming, delta=1e-9)
        self.assertLess(row["index_forward"], row["index"])
        self.assertLess(row["index"], row["index_reverse"])
        # The sky is the CMB to within what two regressions and the jackknife leave open.
        self.assertLess(row["index_forward"] - 3 * row["index_error"], -0.294)
        self.assertGreater(row["index_reverse"] + 3 * row["index_error"], -0.294)

    def test_zero_levels_do_not_matter(self):
        nside = 64
        sky = harness.make_sky(nside, seed=4)
        random = numpy.random.default_rng(8)
        frequencies, offsets = [408e6, 1.42e9], [3.0, 0.4]
        cells = healpy.ud_grade(sky["index"], 8)
        index = healpy.ud_grade(cells, nside)  # one in each cell
        entries = []
        for number, (frequency, offset) in enumerate(zip(frequencies, offsets)):
            clean = power_law(sky["I"], index, 0, frequency)
            noise = numpy.median(clean) / 200
            self.write_map(f"s{number}.fits", [clean + offset + noise * random.standard_normal(clean.size)], unit="K_RJ")
            entries.append({"map": f"s{number}.fits", "frequency": f"{frequency / 1e6:.17g} MHz", "beam_fwhm": "1 deg",
                            "noise": f"{noise:.17g} K_RJ", "zero_level_error": f"{2 * offset} K_RJ"})
        top = f'nside = {nside}\nbeam_fwhm = "1 deg"\nscatter_nside = 8\n'
        self.surveys(top, entries)
        answer = self.index()
        rows = [r for r in answer["scatter"] if r["nside"] == 8]
        self.assertEqual(len(rows), 768)
        truth = numpy.array([cells[int(r["pixel"])] for r in rows])
        found = numpy.array([r["index"] for r in rows])
        error = numpy.array([r["index_error"] for r in rows])
        good = ~numpy.isnan(found) & (error < 0.1)
        self.assertGreater(good.sum(), 700)
        pulls = (found - truth)[good] / error[good]
        self.assertLess(abs(numpy.mean(pulls)), 4 / numpy.sqrt(good.sum()))  # four sigma of a mean of unit pulls
        # Of a jackknife over 16 blocks pulls follow a t distribution of 15 degrees, variance 1.15, known to 5 % from 700.
        self.assertLess(abs(numpy.var(pulls) - 1.15), 0.25)
        # The map itself is off where it has been told nothing, ...
        before = rms(answer["index"][0] - index)
        # ... and right once the levels are fitted.
        self.surveys(top + "fit_zero_levels = true", entries)
        fitted = self.index(out="fitted")
        for survey, offset in zip(fitted["run"]["surveys"], offsets):
            self.assertLess(abs(survey["fitted_zero_level_K_RJ"] - offset), 4 * survey["fitted_zero_level_error_K_RJ"])
            self.assertLess(survey["fitted_zero_level_error_K_RJ"], survey["zero_level_error_K_RJ"] / 5)
        pulls = (fitted["index"][0] - index) / fitted["index"][1]
        self.assertLess(numpy.nanstd(pulls), 1.3)
        after = rms(fitted["index"][0] - index)
        self.assertGreater(before, 5 * after)


class Requests(IndexCase):
    def test_impossible_ones_are_refused(self):
        self.write_map("a.fits", [numpy.ones(768)], unit="K_RJ")
        self.write_map("open.fits", [numpy.ones(768)])
        one = {"map": "a.fits", "frequency": "1 GHz", "beam_fwhm": "8 deg", "noise": "0.1 K_RJ"}
        two = {**one, "frequency": "2 GHz"}
        top = 'nside = 8\nbeam_fwhm = "10 deg"'
        for case, entries, head in (
                ("two|2 different", [one], top), ("3 different", [one, two], top + "\ncurvature = true"),
                ("2 different", [one, one], top), ("wider than the common", [one, two], 'nside = 8\nbeam_fwhm = "5 deg"'),
                ("noise", [one, {k: v for k, v in two.items() if k != "noise"}], top),
                ("unit", [one, {**two, "map": "open.fits"}], top), ("does not exist", [one, {**two, "map": "no.fits"}], top),
                ("zero_level_error", [one, two], top + "\nfit_zero_levels = true"),
                ("did you mean", [one, {**two, "calibration_eror": 0.1}], top), ("power of two", [one, two], 'nside = 9'),
                ("at least 0", [one, {**two, "noise": "-1 K_RJ"}], top),
                ("noise_map", [one, {**two, "noise_map": "a.fits"}], top)):
            with self.subTest(case=case):
                self.surveys(head, entries)
                done = self.foreglow("index", "surveys.toml", "--out", "out", status=2)
                self.assertRegex(done.stderr, case)
                self.assertEqual(len(done.stderr.strip().splitlines()), 1, done.stderr)
                self.assertFalse((self.folder / "out").exists())


if __name__ == "__main__":
    harness.main()
