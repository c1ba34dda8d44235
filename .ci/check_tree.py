#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Holds every file against the rules of the tree: top level, licence line, words and paths, unfinished marks."""

import re
import sys

from tree import REPOSITORY, report, tracked_files

TOP_LEVEL = {"CMakeLists.txt", "README.md", "DEVELOPERS.md", "LICENSE", "src", "models", "data-demo", "tests",
             "scripts", "docs"}
EMPTY_NAMES = {"utils", "util", "helpers", "helper", "common", "misc"}
# The licence line stands where a comment can; prose, data and tool settings have none.
WITH_LICENCE = {".h", ".cpp", ".c", ".in", ".py", ".cmake", ".toml"}
LICENCE = "SPDX-License-Identifier: GPL-2.0-or-later"
# Each pattern is broken up so that this file does not find itself.
PATHS = re.compile("(/wo" "rk/|/ro" "ot/|/fa" "rm/|/ho" "me/[a-z]|/t" r"mp/[A-Za-z0-9])")
WORDS = re.compile(r"\b(as an a" r"i|language mod" r"el|this sess" r"ion|transcr" r"ipt|lect" r"ure)\b", re.I)
MARKS = re.compile(r"\b(TO" r"DO|FIX" r"ME|XX" r"X|not implem" r"ented|st" r"ub)\b")
SKIPPED_TESTS = re.compile("(DISA" "BLED_|GTEST_" "SKIP)")


def needs_licence(path, text):
    if path.name == "CMakeLists.txt" or path.suffix in WITH_LICENCE:
        return True
    return text.startswith("#!")


def main():
    faults = []
    for path in tracked_files():
        top = path.parts[0]
        if not top.startswith(".") and top not in TOP_LEVEL:
            faults.append(f"{path}: {top} is not one of the top level's entries: {', '.join(sorted(TOP_LEVEL))}")
        for part in path.parts:
            if part.split(".")[0].lower() in EMPTY_NAMES:
                faults.append(f"{path}: '{part}' says nothing; name the file or folder for what it holds")
        data = (REPOSITORY / path).read_bytes()
        if b"\0" in data or path.name == "LICENSE":
            continue
        text = data.decode("utf-8", errors="replace")
        if needs_licence(path, text) and not any(LICENCE in line for line in text.splitlines()[:3]):
            faults.append(f"{path}:1: no line '{LICENCE}' among the first three")
        for number, line in enumerate(text.splitlines(), 1):
            for pattern, what in ((PATHS, "a machine's path"), (WORDS, "a word that does not belong"),
                                  (MARKS, "an unfinished mark"), (SKIPPED_TESTS, "a test that does not run")):
                if (found := pattern.search(line)):
                    faults.append(f"{path}:{number}: {what}: {found.group(0)}")
            if line != line.rstrip() and path.suffix in WITH_LICENCE:
                faults.append(f"{path}:{number}: blanks at the end of the line")
    return report("tree", faults)


sys.exit(main())
