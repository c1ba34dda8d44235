#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Wrong studies and models: each gives one clear sentence with the place and the right exit status, and leaves nothing behind.

The places are counted by hand from the texts below.
"""

import collections
import re

import harness

STUDY = """model = "disc-and-loops"
nside = 16
{top}
[[channel]]
name = "low"
frequency = "30 GHz"
{channel}
"""
MODEL = """reference_frequency = "408 MHz"
{top}
[intensity]
map = "survey.fits"
{intensity}
[index]
value = -2.9
{index}
"""
MODEL_STUDY = STUDY.replace("disc-and-loops", "model.toml").format(top="", channel="")
CHANNEL = '[[channel]]\nname = "low"\nfrequency = "30 GHz"\n'

Wrong = collections.namedtuple("Wrong", "kind place words files status")


def study(kind, place, words, text, **files):
    """A wrong study, given whole."""
    return Wrong(kind, "study.toml:" + place, words, {"study.toml": text, **files}, 2)


def top(kind, words, line):
    """A wrong line at the top of a study: line 3."""
    return study(kind, r"3:\d+", words, STUDY.format(top=line, channel=""))


def channel(kind, words, line):
    """A wrong line in the channel: line 7."""
    return study(kind, r"7:\d+", words, STUDY.format(top="", channel=line))


def model(kind, place, words, text=None, **lines):
    """A wrong model, whole or by lines: top is line 2, intensity 5, index 8."""
    text = text or MODEL.format(**{"top": "", "intensity": "", "index": "", **lines})
    return Wrong(kind, "model.toml:" + place, words, {"study.toml": MODEL_STUDY, "model.toml": text}, 2)


def table(key, name, place, words, text):
    """A table of a channel whose content is broken: the work fails, exit status 1, with FILE:LINE."""
    frequency = "" if key == "response" else 'frequency = "30 GHz"\n'
    whole = f'model = "disc-and-loops"\nnside = 16\n[[channel]]\nname = "low"\n{frequency}{key} = "{name}"\n'
    return Wrong("table", f"{name}:{place}", words, {"study.toml": whole, name: text}, 1)


CSV = "frequency_GHz,transmission\n"
WRONG = [
    study("type", "2:9", "whole number", STUDY.format(top="", channel="").replace("16", '"16"')),
    study("type", "2:9", "16.0", STUDY.format(top="", channel="").replace("16", "16.0")),
    top("type", "in quotes", "stokes = 3"),
    top("type", "without quotes", 'pixel_window = "true"'),
    channel("type", "in quotes", "bandwidth = 6"),
    study("type", r"3:\d+", "[[channel]]", 'model = "disc-and-loops"\nnside = 16\n[channel]\nname = "low"\n'),
    model("type", r"5:\d+", "a column's number", intensity="column = 1.5"),

    study("range", "2:9", "64 and 128", STUDY.format(top="", channel="").replace("16", "100")),
    study("range", "2:9", "24.0 GiB", STUDY.format(top="", channel="").replace("16", "16384")),
    top("range", "1e-9 and 0.1", "accuracy = 0.5"),
    top("range", "4 nside = 64", "lmax = 65"),
    top("range", "-1", "seed = -1"),
    channel("range", "180 deg", 'beam_fwhm = "0 deg"'),
    channel("range", "zero frequency", 'bandwidth = "60 GHz"'),
    study("range", r"6:\d+", "'count'", 'model = "disc-and-loops"\nnside = 16\n[channel_grid]\nfirst = "50 MHz"\n'
          'last = "60 MHz"\ncount = 0\n'),
    model("range", r"9:\d+", "between -2 and 2", index="[curvature]\nvalue = 5"),

    top("unit", "K_CMB", 'unit = "K"'),
    top("unit", 'did you mean "uK_CMB"', 'unit = "uk_cmb"'),
    channel("unit", "no unit", 'bandwidth = "6"'),
    channel("unit", "'GHZ'", 'bandwidth = "6 GHZ"'),
    channel("unit", "arcmin", 'beam_fwhm = "33 GHz"'),
    channel("unit", "arcmin", 'noise = "5 uK_CMB"'),
    model("unit", r"5:\d+", "K_RJ", intensity='zero_level = "8.9 K"'),

    top("unknown key", "did you mean 'ordering'", 'ordring = "ring"'),
    channel("unknown key", "did you mean 'bandwidth'", 'bandwith = "6 GHz"'),
    study("unknown key", r"3:\d+", "did you mean 'channel_grid'",
          'model = "disc-and-loops"\nnside = 16\n[chanel_grid]\ncount = 3\n'),
    model("unknown key", r"5:\d+", "did you mean 'column'", intensity="colum = 1"),
    model("unknown key", r"8:\d+", "did you mean 'polarization'", index="[polarisation]"),
    model("conflict", r"9:\d+", "contradicts 'scatter'", index="scatter = 0.1\ndecorrelation_length = 20"),
    study("unknown key", r"11:\d+", "did you mean 'center'",
          STUDY.format(top="", channel='\n[[patch]]\nname = "deep"\ncenter = [1, 2]\ncentre = [1, 2]')),

    study("conflict", r"8:\d+", "contradicts 'bandwidth'",
          STUDY.format(top="", channel='bandwidth = "6 GHz"\nresponse = "low.csv"'), **{"low.csv": CSV + "28,1\n32,1\n"}),
    study("conflict", r"8:\d+", "contradicts 'beam_fwhm'",
          STUDY.format(top="", channel='beam_fwhm = "9 deg"\nbeam_window = "bl.csv"'), **{"bl.csv": "l,B_l\n0,1\n"}),
    study("conflict", r"8:\d+", "a name of its own",
          STUDY.format(top="", channel="\n" + CHANNEL.replace("low", "LOW"))),
    study("conflict", r"6:\d+", "'first' and 'last'", 'model = "disc-and-loops"\nnside = 16\n[channel_grid]\n'
          'first = "50 MHz"\nlast = "60 MHz"\ncount = 1\n'),
    model("conflict", r"8:\d+", "contradicts 'value'", index='map = "survey.fits"'),
    model("conflict", r"\d+:\d+", "contradicts [sketch]", index="[sketch]"),
    model("conflict", r"9:\d+", "contradicts 'frequency'", index='frequency = "1 GHz"\nbetween = ["1 GHz", "2 GHz"]'),

    study("missing", "1:1", "'model' is missing", "nside = 16\n" + CHANNEL),
    study("missing", "1:1", "'nside' is missing", 'model = "disc-and-loops"\n' + CHANNEL),
    study("missing", "1:1", "no channel", 'model = "disc-and-loops"\nnside = 16\n'),
    study("missing", r"3:\d+", "'frequency' is missing",
          'model = "disc-and-loops"\nnside = 16\n[[channel]]\nname = "low"\n'),
    study("missing", r"3:\d+", "'name' is missing",
          'model = "disc-and-loops"\nnside = 16\n[[channel]]\nfrequency = "30 GHz"\n'),
    model("missing", "1:1", "'reference_frequency' is missing", '[intensity]\nmap = "survey.fits"\n'),
    model("missing", "1:1", "[index] is missing", 'reference_frequency = "1 GHz"\n[intensity]\nmap = "survey.fits"\n'),
    model("missing", r"2:\d+", "'map' is missing",
          'reference_frequency = "1 GHz"\n[intensity]\ncolumn = 1\n[index]\nvalue = -3\n'),

    study("path", "1:9", 'did you mean "disc-and-loops"', STUDY.format(top="", channel="").replace("disc", "disk")),
    top("path", "'none.fits', which does not exist", 'coverage = "none.fits"'),
    channel("path", "'none.csv', which does not exist", 'response = "none.csv"'),
    channel("path", "a folder", 'beam_window = "."'),
    model("path", "4:7", "'none.fits', which does not exist", MODEL.format(top="", intensity="", index="").replace(
        "survey.fits", "none.fits")),

    study("syntax", r"3:\d+", "TOML", STUDY.format(top='title = "never closed', channel="")),
    study("syntax", r"3:\d+", "TOML", STUDY.format(top="title =", channel="")),
    study("syntax", r"3:\d+", "TOML", STUDY.format(top="nside = 32", channel="")),
    study("syntax", r"3:\d+", "TOML", STUDY.format(top="[[channel]", channel="")),
    study("syntax", r"3:\d+", "TOML", STUDY.format(top="frequency: 30 GHz", channel="")),
    model("syntax", r"8:\d+", "TOML", index="[index]"),

    table("response", "low.csv", "3", "below zero", CSV + "28,1\n32,-1\n"),
    table("response", "low.csv", "3", "sort", CSV + "32,1\n28,1\n"),
    table("response", "low.csv", "2", "no finite number", CSV + "28,one\n32,1\n"),
    table("response", "low.csv", "1", "header", "nu,tau\n28,1\n32,1\n"),
    table("response", "low.csv", "3", "cells", CSV + "28,1\n32\n"),
    table("beam_window", "bl.csv", "3", "comes next", "l,B_l\n0,1\n2,1\n"),
    table("beam_window", "bl.csv", "2", "above zero", "l,B_l\n0,0\n1,1\n"),
]


class WrongRequests(harness.Case):
    def check(self, wrong):
        for name, text in wrong.files.items():
            self.write(name, text)
        if "model.toml" in wrong.files:
            self.write("survey.fits", "no study gets as far as opening it")
        before = sorted(self.folder.rglob("*"))
        done = self.foreglow("make", "study.toml", "--quiet", status=wrong.status)
        self.assertEqual(done.stdout, "")
        self.assertRegex(done.stderr, r"\Aforeglow: [^\n]+\n\Z")  # one line, and only one
        self.assertRegex(done.stderr, r"\Aforeglow: (\./)?" + wrong.place.replace(".", r"\.", 1) + ": ")
        self.assertIn(wrong.words, done.stderr)
        self.assertEqual(sorted(self.folder.rglob("*")), before)

    def test_there_are_enough_of_each_kind(self):
        kinds = collections.Counter(wrong.kind for wrong in WRONG)
        for kind in ["type", "range", "unit", "unknown key", "conflict", "missing", "path", "syntax", "table"]:
            self.assertGreaterEqual(kinds[kind], 5, kind)

    def test_options_are_named_as_they_were_typed(self):
        self.write("study.toml", STUDY.format(top="", channel=""))
        for assignment, words in [("nside=100", "64 and 128"), ("channel.high.noise=1", "there are low"), ("nside", "key=value"),
                                  ("nsid=64", "did you mean 'nside'"), ("model.index=1", "the string 'disc-and-loops'")]:
            done = self.foreglow("make", "study.toml", "--quiet", "--set", assignment, status=2)
            self.assertRegex(done.stderr, r"\Aforeglow: --set " + re.escape(assignment) + r": [^\n]+\n\Z")
            self.assertIn(words, done.stderr)
            self.assertEqual([path.name for path in self.folder.iterdir()], ["study.toml"])

    def test_a_study_that_is_not_there_is_said_so(self):
        done = self.foreglow("make", "none.toml", status=2)
        self.assertRegex(done.stderr, r"\Aforeglow: [^\n]*'none\.toml'[^\n]+\n\Z")
        self.assertEqual(list(self.folder.iterdir()), [])


def add_tests():
    """Gives every wrong request a test of its own, so that each is reported by its kind and number."""
    numbers = collections.Counter()
    for wrong in WRONG:
        numbers[wrong.kind] += 1
        name = f"test_{wrong.kind.replace(' ', '_')}_{numbers[wrong.kind]}"
        setattr(WrongRequests, name, lambda self, wrong=wrong: self.check(wrong))


add_tests()
if __name__ == "__main__":
    harness.main()
