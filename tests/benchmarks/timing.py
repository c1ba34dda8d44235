# SPDX-License-Identifier: GPL-2.0-or-later
"""How the benchmarks time and compare: each line of the table is the median of ratios, both sides measured alternately."""

import json
import os
import resource
import shutil
import statistics
import subprocess
import sys
import time
from dataclasses import dataclass, field
from pathlib import Path


@dataclass
class Seconds:
    """Holds what something took: by the clock, and of all processors together."""
    wall: float
    cpu: float

    def __add__(self, other):
        return Seconds(self.wall + other.wall, self.cpu + other.cpu)

    def __sub__(self, other):
        return Seconds(self.wall - other.wall, self.cpu - other.cpu)

    def __mul__(self, factor):
        return Seconds(self.wall * factor, self.cpu * factor)

    def __truediv__(self, other):
        return Seconds(self.wall / other.wall, self.cpu / max(other.cpu, 1e-9))


@dataclass
class Line:
    """Holds one line of the table; ratios are Seconds / Seconds, one for each pair."""
    group: str
    what: str
    ratios: list
    target: str = ""  # ">= 25" or "<= 1.6", or "" where the line only informs
    note: str = ""
    samples: dict = field(default_factory=dict)

    @property
    def ratio(self):
        return statistics.median(r.wall for r in self.ratios)

    @property
    def cpu_ratio(self):
        return statistics.median(r.cpu for r in self.ratios)

    @property
    def met(self):
        if not self.target:
            return None
        sign, bound = self.target.split()
        return self.ratio >= float(bound) if sign == ">=" else self.ratio <= float(bound)

    def as_dict(self):
        return {"group": self.group, "what": self.what, "ratio": self.ratio, "cpu_ratio": self.cpu_ratio,
                "ratios": [r.wall for r in self.ratios], "cpu_ratios": [r.cpu for r in self.ratios],
                "target": self.target, "met": self.met, "note": self.note,
                "seconds": {name: [s.wall for s in samples] for name, samples in self.samples.items()},
                "cpu_seconds": {name: [s.cpu for s in samples] for name, samples in self.samples.items()}}


def significant(value):
    return f"{value:.0f}" if value >= 100 else f"{value:.3g}"


def table(lines):
    """Returns the table as text."""
    rows = [("what", "ratio", "target", "met", "in CPU s", "note")]
    for line in lines:
        met = {None: "", True: "yes", False: "NO"}[line.met]
        rows.append((line.what, significant(line.ratio), line.target, met, significant(line.cpu_ratio), line.note))
    widths = [max(len(row[i]) for row in rows) for i in range(5)]
    text = []
    for row in rows:
        cells = [row[0].ljust(widths[0]), *(row[i].rjust(widths[i]) for i in range(1, 5)), row[5]]
        text.append("  ".join(cells).rstrip())
    text.insert(1, "-" * max(len(t) for t in text))
    return "\n".join(text)


class Failed(Exception):
    """Says which program of a comparison failed, and its last words."""


def run(command, environment=None, output=subprocess.PIPE):
    """Runs a program; returns its Seconds and what it printed (nothing where that goes to an open file)."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    start = time.perf_counter()
    done = subprocess.run([str(word) for word in command], stdout=output, stderr=subprocess.PIPE, text=True,
                          stdin=subprocess.DEVNULL, env={**os.environ, **(environment or {})})
    wall = time.perf_counter() - start
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    if done.returncode != 0:
        words = (done.stderr or done.stdout).strip().splitlines()
        raise Failed(f"{Path(command[0]).name} exited with {done.returncode}: {' | '.join(words[-3:])}")
    cpu = after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime
    return Seconds(wall, cpu), done.stdout


def interleave(repeats, **sides):
    """Calls the sides in turn, A B A B ...; returns {name: [Seconds]}."""
    samples = {name: [] for name in sides}
    for _ in range(repeats):
        for name, side in sides.items():
            samples[name].append(side())
    return samples


def ratios(above, below):
    return [a / b for a, b in zip(above, below)]


class Workplace:
    """Knows the programs to time, the folders to work in, and how large a run is wanted."""

    def __init__(self, build, quick):
        self.quick = quick
        self.repeats = 1 if quick else 3
        self.command = build / "src" / "foreglow"
        self.bare_work = build / "tests" / "benchmarks" / "bare_work"
        self.kernels = build / "tests" / "benchmarks" / "benchmark_kernels"
        self.threads = len(os.sched_getaffinity(0))
        self.disk = build / "scratch"
        memory = Path("/dev/shm")
        self.memory = (memory if memory.is_dir() else build) / f"foreglow-benchmark-{os.getpid()}"
        for folder in (self.disk, self.memory):
            folder.mkdir(parents=True, exist_ok=True)

    def clean(self):
        for folder in (self.disk, self.memory):
            shutil.rmtree(folder, ignore_errors=True)

    def require_room(self, folder, size):
        """Fails early where outputs of that many bytes do not fit with a fifth to spare."""
        free = shutil.disk_usage(folder).free
        if folder == self.memory:
            words = Path("/proc/meminfo").read_text().split()
            free = min(free, 1024 * int(words[words.index("MemAvailable:") + 1]))
        if free < 1.2 * size:
            raise Failed(f"{size / 1e9:.1f} GB do not fit into {'memory' if folder == self.memory else 'the disk'}")

    def make(self, study, folder, threads=None):
        """Runs the command on a study into a new folder; returns its Seconds, the manifest and the bytes of the maps.

        What it left is deleted and the disk at rest afterwards, so that nothing is left for the next to wait for.
        """
        out = folder / "out"
        seconds, _ = run([self.command, "make", study, "--out", out, "--quiet", "--threads", threads or self.threads])
        manifest = json.loads((out / "run.json").read_text())
        size = sum(file.stat().st_size for file in (out / "maps").iterdir())
        self.forget(out, folder)
        return seconds, manifest, size

    def forget(self, out, folder):
        shutil.rmtree(out)
        if folder == self.disk:
            os.sync()

    def script(self, name, study, channels, every):
        """Runs one of the two Python scripts on each `every`-th channel; returns the Seconds of all channels.

        Channels after the first cost the same, so the others are added by their median.
        """
        out = self.memory / "script"
        script = Path(__file__).resolve().parent / f"{name}.py"
        _, printed = run(["/usr/bin/python3", script, study, out, every])
        shutil.rmtree(out)
        setup, first, *others = (Seconds(*pair) for pair in json.loads(printed))
        each = Seconds(statistics.median(s.wall for s in others), statistics.median(s.cpu for s in others))
        return setup + first + each * (channels - 1)

    def bare(self, folder, inputs=(), **numbers):
        """Runs nothing but transforms, reading and writing; returns their Seconds."""
        words = [f"{name}={value}" for name, value in numbers.items()]
        words += [f"read={path}" for path in inputs]
        _, printed = run([self.bare_work, f"threads={self.threads}", f"folder={folder}", *words])
        if folder == self.disk:
            os.sync()
        return Seconds(*json.loads(printed))


def say(text):
    print(text, file=sys.stderr, flush=True)
