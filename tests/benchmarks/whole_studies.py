# SPDX-License-Identifier: GPL-2.0-or-later
"""Whole runs of the command against the two scripts, against bare transforms and raw files, and against themselves.

Scripts and command write to a memory file system; comparisons with raw writing share the disk and the durability (each file is
synced before it is renamed).
"""

from make_inputs import make_study
from timing import Line, interleave, ratios


def against_script(place, group, what, study, channels, script, every, target):
    """How many times faster the command is than a script."""
    sides = interleave(place.repeats, foreglow=lambda: place.make(study, place.memory)[0],
                       script=lambda: place.script(script, study, channels, every))
    return Line(group, f"{what} / run", ratios(sides["script"], sides["foreglow"]), target,
                script_note(channels, every), sides)


def against_script_with_limit(place, group, what, study, channels, script, every, target, beams):
    """The same, and how many times faster the bare work (transforms and raw writing into memory) would be alone."""
    known = {}

    def foreglow():
        seconds, known["manifest"], known["size"] = place.make(study, place.memory)
        return seconds

    sides = interleave(place.repeats, foreglow=foreglow,
                       script=lambda: place.script(script, study, channels, every),
                       bare=lambda: place.bare(place.memory, **bare_numbers(known, beams)))
    yield Line(group, f"{what} / run", ratios(sides["script"], sides["foreglow"]), target,
               script_note(channels, every), sides)
    yield Line(group, f"{what} / bare work", ratios(sides["script"], sides["bare"]), "",
               "what a run without any cost of its own would reach", sides)


def script_note(channels, every):
    return "" if every == 1 else f"script timed on {len(range(0, channels, every))} channels"


def bare_numbers(known, beams):
    """Returns what bare_work is to do in place of a run: known holds the run's manifest and the bytes of its maps."""
    manifest, files = known["manifest"], len(known["manifest"]["channels"])
    numbers = {"files": files, "bytes": known["size"] // files}
    if beams:
        numbers |= {"nside": manifest["nside"], "lmax": manifest["lmax"], **transform_counts(manifest)[0]}
    return numbers


def transform_counts(manifest):
    """Returns how many transforms of each kind a run with beams needed, from its manifest, and a note of them."""
    accuracy, channels = manifest["accuracy"], len(manifest["channels"])
    polarized = accuracy.get("polarized_components", 0) > 0
    counts = {"analyses": accuracy["intensity_components"], "analyses2": accuracy.get("polarized_components", 0),
              "syntheses": accuracy.get("intensity_skeletons", channels),
              "syntheses2": accuracy.get("polarized_skeletons", channels) if polarized else 0}
    return counts, f"K {counts['analyses']} {counts['analyses2']}, R {counts['syntheses']} {counts['syntheses2']}"


def against_bare(place, group, what, study, target, beams=True, inputs=()):
    """How many times longer the command takes than bare transforms, raw writing and, where named, raw reading."""
    known = {}

    def foreglow():
        seconds, known["manifest"], known["size"] = place.make(study, place.disk)
        return seconds

    sides = interleave(place.repeats, foreglow=foreglow,
                       bare=lambda: place.bare(place.disk, inputs, **bare_numbers(known, beams)))
    note = transform_counts(known["manifest"])[1] if beams else f"{known['size'] / 1e9:.2f} GB"
    return Line(group, what, ratios(sides["foreglow"], sides["bare"]), target, note, sides)


def no_beams(place):
    study = make_study(place.memory, 512, 40)
    every = 10 if place.quick else 1
    yield from against_script_with_limit(place, "no-beams", "no beams, 512 x 40: careful script", study, 40,
                                         "careful_study", every, ">= 25", beams=False)
    yield against_script(place, "no-beams", "no beams, 512 x 40: plain script", study, 40, "plain_study", 10,
                         ">= 150")
    yield against_bare(place, "no-beams", "no beams, 512 x 40: run / raw write", study, "<= 1.6", beams=False)


def beams_40(place):
    study = make_study(place.memory, 512, 40, beams=True)
    every = 20 if place.quick else 5
    yield from against_script_with_limit(place, "beams-40", "beams, 512 x 40: careful script", study, 40,
                                         "careful_study", every, ">= 5", beams=True)
    yield against_script(place, "beams-40", "beams, 512 x 40: plain script", study, 40, "plain_study", 20, ">= 25")
    yield against_bare(place, "beams-40", "beams, 512 x 40: run / (transforms + raw write)", study, "<= 1.25")


def beams_200(place):
    place.require_room(place.memory, 7.6e9)
    study = make_study(place.memory, 512, 200, beams=True)
    yield from against_script_with_limit(place, "beams-200", "beams, 512 x 200: careful script", study, 200,
                                         "careful_study", 25, ">= 15", beams=True)
    yield against_bare(place, "beams-200", "beams, 512 x 200: run / (transforms + raw write)", study, "<= 1.25")


def beams_1000(place):
    place.require_room(place.memory, 9.5e9)
    study = make_study(place.memory, 256, 1000, beams=True)
    yield from against_script_with_limit(place, "beams-1000", "beams, 256 x 1000: careful script", study, 1000,
                                         "careful_study", 100, ">= 30", beams=True)
    yield against_bare(place, "beams-1000", "beams, 256 x 1000: run / (transforms + raw write)", study, "<= 1.25")


def extra_channels(place):
    place.require_room(place.disk, 9.5e9)
    for beams in (True, False):
        known = {}
        few, many = (make_study(place.memory, 256, n, beams) for n in (100, 1000))

        def first():
            seconds, _, known["size"] = place.make(few, place.disk)
            return seconds
        sides = interleave(place.repeats, few=first, many=lambda: place.make(many, place.disk)[0],
                           raw=lambda: place.bare(place.disk, files=900, bytes=known["size"] // 100))
        more = [b - a for a, b in zip(sides["few"], sides["many"])]
        yield Line("extra-channels", f"{'' if beams else 'no '}beams, 256: (1000 - 100 channels) / raw write of 900",
                   ratios(more, sides["raw"]), "<= 1.5", "", sides)


def one_channel(place):
    for nside in (512,) if place.quick else (512, 1024):
        study = make_study(place.memory, nside, 1, beams=True, low=60.0)
        inputs = [place.memory / f"{name}{nside}.fits" for name in ("sky", "index", "curvature")]
        yield against_bare(place, "one-channel", f"one channel with a beam, {nside}: run / (read + transforms + write)",
                           study, "<= 1.1", inputs=inputs)


def growth(place, group, what, studies):
    """Compares each study with the one before; studies is a list of (label, path)."""
    sides = interleave(place.repeats, **{label: lambda p=path: place.make(p, place.memory)[0] for label, path in studies})
    for (before, _), (after, _) in zip(studies, studies[1:]):
        yield Line(group, f"{what}: {after} / {before}", ratios(sides[after], sides[before]), "", "",
                   {label: sides[label] for label in (before, after)})


def growth_channels(place):
    counts = (1, 10, 100) if place.quick else (1, 10, 100, 1000)
    for beams in (False, True):
        studies = [(f"{n} ch", make_study(place.memory, 128, n, beams, beam_scale=120.0)) for n in counts]
        yield from growth(place, "growth-channels", f"channels, {'beams' if beams else 'no beams'}, 128", studies)


def growth_pixels(place):
    sizes = (64, 128, 256, 512) if place.quick else (64, 128, 256, 512, 1024, 2048)
    for beams, channels in ((False, 10), (True, 1)):
        studies = [(f"nside {n}", make_study(place.memory, n, channels, beams, low=60.0)) for n in sizes]
        yield from growth(place, "growth-pixels", f"pixels, {'beams' if beams else 'no beams'}, {channels} ch", studies)


def growth_threads(place):
    for beams in (False, True):
        study = make_study(place.memory, 512, 40, beams)
        sides = interleave(place.repeats, one=lambda: place.make(study, place.memory, threads=1)[0],
                           two=lambda: place.make(study, place.memory, threads=2)[0])
        yield Line("growth-threads", f"threads, {'beams' if beams else 'no beams'}, 512 x 40: 1 / 2",
                   ratios(sides["one"], sides["two"]), "", "2 is ideal by the clock, 1 in CPU s", sides)


GROUPS = {"no-beams": no_beams, "beams-40": beams_40, "beams-200": beams_200, "beams-1000": beams_1000,
          "extra-channels": extra_channels, "one-channel": one_channel, "growth-channels": growth_channels,
          "growth-pixels": growth_pixels, "growth-threads": growth_threads}
LONG = ("beams-200", "beams-1000", "extra-channels")  # left out of a quick run: tens of gigabytes
