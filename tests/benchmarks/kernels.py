# SPDX-License-Identifier: GPL-2.0-or-later
"""The program benchmark_kernels, whose cases are named GROUP/CASE/WHO, as lines of the table."""

import json

from timing import Line, Seconds, ratios, run

# GROUP/CASE, who is above, who is below, what the ratio is, target
COMPARISONS = [
    ("writer/disk", "bare", "foreglow", "writer, synced: speed / raw write", ">= 0.6"),
    ("writer/memory", "bare", "foreglow", "writer, in memory: speed / raw write", ">= 0.6"),
    ("writer/memory", "cfitsio columns", "foreglow", "writer, in memory: speed / CFITSIO by columns", ""),
    ("writer/memory", "healpix", "foreglow", "writer, in memory: speed / HEALPix C++", ""),
    ("reader/cached", "bare", "foreglow", "reader: speed / raw read", ">= 0.6"),
    ("reader/cached", "bare, old memory", "foreglow", "reader: speed / raw read into old memory", ""),
    ("law/memory", "foreglow", "bare", "spectral law / triad, arrays in memory", ""),
    ("law/tile", "foreglow", "bare", "spectral law / triad, arrays in cache", ""),
    ("analysis/spin 0", "foreglow", "bare", "analysis, spin 0 / libsharp", ""),
    ("analysis/spin 2", "foreglow", "bare", "analysis, spin 2 / libsharp", ""),
    ("synthesis/spin 0", "foreglow", "bare", "synthesis, spin 0 / libsharp", ""),
    ("synthesis/spin 2", "foreglow", "bare", "synthesis, spin 2 / libsharp", ""),
    ("deviates/normal", "bare", "foreglow", "normal deviates: speed / Box-Muller by libm", "")]


def measure(place):
    """Returns {(GROUP/CASE, WHO): [Seconds of each repetition]}; repetitions of all cases are interleaved."""
    result = place.memory / "kernels.json"
    run([place.kernels, f"--benchmark_repetitions={3 if place.quick else 5}", "--benchmark_enable_random_interleaving=true",
         f"--benchmark_min_time={0.05 if place.quick else 0.3}", f"--benchmark_out={result}", "--benchmark_out_format=json"],
        {"FOREGLOW_BENCHMARK_DISK": str(place.disk), "FOREGLOW_BENCHMARK_MEMORY": str(place.memory)})
    seconds = {}
    for case in json.loads(result.read_text())["benchmarks"]:
        if case["run_type"] != "iteration":
            continue
        group, name, who = case["run_name"].split("/")[:3]
        scale = {"ns": 1e-9, "us": 1e-6, "ms": 1e-3, "s": 1.0}[case["time_unit"]]
        seconds.setdefault((f"{group}/{name}", who), []).append(
            (case["repetition_index"], Seconds(case["real_time"] * scale, case["cpu_time"] * scale)))
    return {key: [s for _, s in sorted(values, key=lambda v: v[0])] for key, values in seconds.items()}


def kernels(place):
    seconds = measure(place)
    for case, above, below, what, target in COMPARISONS:
        a, b = seconds[case, above], seconds[case, below]
        yield Line("kernels", what, ratios(a, b), target, "", {above: a, below: b})
    million = seconds["positions/million", "foreglow"]
    yield Line("kernels", "a million positions on a model over templates, no text: 1 s / time",
               [Seconds(1, 1) / s for s in million], ">= 1", "", {"foreglow": million})
