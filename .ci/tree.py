# SPDX-License-Identifier: GPL-2.0-or-later
"""The repository's files, for the checks beside this one."""

import subprocess
from pathlib import Path

REPOSITORY = Path(__file__).resolve().parent.parent


def tracked_files():
    """Returns the paths, relative to the repository, of all files that are or would be committed."""
    listing = subprocess.run(
        ["git", "-c", "safe.directory=*", "ls-files", "-z", "--cached", "--others", "--exclude-standard"],
        cwd=REPOSITORY, check=True, capture_output=True, text=True).stdout
    return sorted(Path(name) for name in set(listing.split("\0")) if name and (REPOSITORY / name).is_file())


def report(title, faults):
    """Prints the faults, or one line when there is none, and returns the exit status."""
    for fault in faults:
        print(fault)
    print(f"{title}: {f'{len(faults)} faults' if faults else 'good'}")
    return 1 if faults else 0
