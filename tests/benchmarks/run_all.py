#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Runs the benchmarks of a build folder, prints their table and writes BUILD/benchmark.json; scripts/benchmark calls it.

Usage: run_all.py BUILD [--quick] [--only NAME]...
"""

import argparse
import json
import os
import signal
import sys
from pathlib import Path

from answers import answers
from index_surveys import index_surveys
from kernels import kernels
from timing import Failed, Workplace, say, significant, table
from whole_studies import GROUPS, LONG


def main():
    groups = {**GROUPS, "index": index_surveys, "answers": answers, "kernels": kernels}
    parser = argparse.ArgumentParser(prog="scripts/benchmark", description="Measures Foreglow against what it should be "
                                     "compared with; every number is a ratio of two things measured in turn.")
    parser.add_argument("build", type=Path, help=argparse.SUPPRESS)
    parser.add_argument("--quick", action="store_true", help="one pair of each instead of three, and none of the "
                        "largest studies")
    parser.add_argument("--only", action="append", choices=groups, metavar="NAME", help="only this group, repeatable: "
                        + ", ".join(groups))
    options = parser.parse_args()
    signal.signal(signal.SIGTERM, lambda *_: sys.exit(143))  # so that the folders in memory are deleted
    wanted = [g for g in groups if (g in options.only if options.only else not (options.quick and g in LONG))]
    place = Workplace(options.build.resolve(), options.quick)
    load, lines, failures = [os.getloadavg()[0]], [], []
    try:
        for name in wanted:
            try:
                for line in groups[name](place):
                    lines.append(line)
                    say(f"{line.group}: {line.what}: {significant(line.ratio)} {line.target}")
            except Failed as failure:
                failures.append(f"{name}: {failure}")
                say(failures[-1])
    finally:
        place.clean()
    load.append(os.getloadavg()[0])
    result = options.build / "benchmark.json"
    result.write_text(json.dumps({"threads": place.threads, "quick": options.quick, "load_average": load,
                                  "lines": [line.as_dict() for line in lines], "failures": failures}, indent=1) + "\n")
    print(table(lines))
    missed = sum(line.met is False for line in lines)
    print(f"{place.threads} threads; median of {place.repeats} pairs (kernels: of {3 if options.quick else 5}); "
          f"{sum(line.met is True for line in lines)} targets met, {missed} not; load average {load[0]:.1f} at the start"
          f"{', which is too high to trust the clock: see the ratios in CPU s' if load[0] > 1 else ''}; {result}")
    for failure in failures:
        print(f"not measured: {failure}")
    return 1 if failures else 0


if __name__ == "__main__":
    sys.exit(main())
