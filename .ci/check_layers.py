#!/usr/bin/python3
# SPDX-License-Identifier: GPL-2.0-or-later
"""Holds src/ against src/layers.txt and against the table of which room alone touches which library."""

import re
import sys

from tree import REPOSITORY, report, tracked_files

INCLUDE = re.compile(r'^\s*#\s*include\s*(?:"([^"]*)"|<([^>]*)>)')
# Headers that the build writes into its own folder; they belong to no room.
GENERATED = re.compile(r"^foreglow_\w+\.h$")
# What is looked for in a line of code, and the rooms that may have it.
# HEALPix's FITS layer belongs to HEALPix: sphere reads pixel windows and ring weights through it.
LIBRARIES = [
    ("OpenMP", re.compile(r"#\s*pragma\s+omp|#\s*include\s*<omp\.h>"), {"base"}),
    ("Random123", re.compile(r"#\s*include\s*[<\"]Random123/"), {"base"}),
    ("HEALPix C++", re.compile(r"#\s*include\s*[<\"](healpix_cxx/|healpix_\w+\.h|alm\w*\.h|arr\.h|rotmatrix\.h|"
                               r"pointing\.h|vec3\.h|fitshandle\.h|powspec\w*\.h|weight_utils\.h|planck_\w+\.h|xcomplex\.h)"),
     {"sphere"}),
    ("libsharp", re.compile(r"#\s*include\s*[<\"](libsharp/|sharp\w*\.h)"), {"sphere"}),
    ("CFITSIO", re.compile(r"#\s*include\s*[<\"](fitsio|cfitsio/)"), {"io"}),
    ("FFTW", re.compile(r"#\s*include\s*[<\"]fftw3"), {"math"}),
    ("toml++", re.compile(r"#\s*include\s*[<\"](toml\+\+/|toml\.h)"), {"io"}),
    ("nlohmann-json", re.compile(r"#\s*include\s*[<\"]nlohmann/"), {"io"}),
    ("xxHash", re.compile(r"#\s*include\s*[<\"]xxh"), {"io"}),
    ("Cairo", re.compile(r"#\s*include\s*[<\"]cairo"), {"picture"}),
    ("FreeType", re.compile(r"#\s*include\s*[<\"](ft2build\.h|freetype)|#\s*include\s*FT_"), {"picture"}),
    ("zlib", re.compile(r"#\s*include\s*[<\"]zlib"), {"picture"}),
    ("CLI11", re.compile(r"#\s*include\s*[<\"]CLI/"), {"app"}),
]
# These headers are slow to read, so each is read once in the whole build.
ONCE = {"toml++", "CLI11"}


def read_layers():
    """Returns {room: set of the rooms it may include} and the faults of the table itself."""
    allowed, faults = {}, []
    for number, line in enumerate((REPOSITORY / "src/layers.txt").read_text().splitlines(), 1):
        line = line.split("#")[0].strip()
        if not line:
            continue
        room, _, below = line.partition(":")
        for other in below.split():
            if other not in allowed:  # a table in which every room stands below those it includes has no cycle
                faults.append(f"src/layers.txt:{number}: {room} may not include {other}, which stands further down")
        allowed[room] = set(below.split())
    return allowed, faults


def check_file(path, allowed, used, touched, faults):
    room = path.parts[1]
    for number, line in enumerate((REPOSITORY / path).read_text().splitlines(), 1):
        where = f"{path}:{number}"
        for name, pattern, rooms in LIBRARIES:
            if pattern.search(line):
                touched.setdefault(name, []).append(where)
                if room not in rooms:
                    faults.append(f"{where}: {room} touches {name}, which only {', '.join(sorted(rooms))} may")
        found = INCLUDE.match(line)
        if not found or found.group(1) is None or GENERATED.match(found.group(1)):
            continue
        target = found.group(1)
        other, slash, name = target.partition("/")
        if not slash or "/" in name or not (REPOSITORY / "src" / target).is_file():
            faults.append(f'{where}: "{target}" is not of the form "room/file.h" of a file that exists')
        elif other != room:
            used.setdefault((room, other), where)
            if other not in allowed[room]:
                faults.append(f"{where}: {room} may not include {other} (src/layers.txt)")


def main():
    allowed, faults = read_layers()
    used, touched = {}, {}
    for path in tracked_files():
        if path.parts[0] != "src" or path.suffix not in {".h", ".cpp", ".c"}:
            continue
        if len(path.parts) != 3 or path.parts[1] not in allowed:
            faults.append(f"{path}: not in a room of src/layers.txt")
            continue
        check_file(path, allowed, used, touched, faults)
    for room, below in allowed.items():
        if not any((REPOSITORY / "src" / room).glob("*.cpp")):
            faults.append(f"src/layers.txt: {room} has no source file")
        faults += [f"src/layers.txt: nobody in {room} includes {other} any more; take it out"
                   for other in sorted(below) if (room, other) not in used]
    for name in sorted(ONCE):
        if len(touched.get(name, [])) > 1:
            faults.append(f"{name} is slow to compile and must be included once, not at {', '.join(touched[name])}")
    return report("layers", faults)


sys.exit(main())
