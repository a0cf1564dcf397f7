# SPDX-License-Identifier: GPL-3.0-or-later
# run_ranks_same.py: `wend run` writes the same bytes in every data set and in the ledger on any number of ranks.
import run_tool as rt

RANKS = (1, 2, 3, 4, 8)


def compare(case, text):
    """Runs a setup, FOLDER standing for its folder, on each number of ranks."""
    first = None
    for ranks in RANKS:
        where = f"{case}{ranks}"
        rt.run(ranks, rt.setup(f"{where}.yaml", text.replace("FOLDER", where)), "--quiet")
        found = rt.digests(where, "x"), rt.ledger(where, "x")[1]
        first = first or found
        rt.check(len(found[0]) > 2, f"{case} on {ranks} ranks: outputs {found[0]}")
        rt.check(found[0] == first[0], f"{case} on {ranks} ranks: data sets differ from those of 1 rank")
        rt.check(found[1] == first[1], f"{case} on {ranks} ranks: the ledger differs from that of 1 rank")


def clustered():
    """A quarter of the particles in a corner, so that cuts by number are uneven in pairs; all records."""
    import numpy as np
    records = rt.blob(3, 12, jitter=0.4)
    n = len(records["id"])
    for c in records["position"]:
        c[: n // 4] = 0.3 * c[: n // 4]
    random = np.random.default_rng(7)
    records["massDensity"] = 1e-21 * (0.5 + random.random(n))
    records["perpendicularDiffusivity"] = 3e22 * random.random(n)
    records["velocity"] = [1e3 * random.standard_normal(n) for _ in range(3)]
    return records


def check_times(where, expected):
    """Outputs come at the times asked for, to the last digits of a double in Myr."""
    found = []
    for name in rt.outputs(where, "x"):
        with rt.h5py.File(rt.path(f"{where}/{name}"), "r") as f:
            step = next(iter(f["data"].values()))
            found.append(step.attrs["time"] * step.attrs["timeUnitSI"] / rt.MYR)
    good = len(found) == len(expected) and max(abs(a - b) for a, b in zip(found, expected)) < 1e-15
    rt.check(good, f"output times {found} for {expected}")


def main():
    rt.write("plane.h5", rt.blob(2, 24))
    # along the field only, energy leaves through open borders, output times of both kinds
    compare("plane", "particles: plane.h5\noutput: {folder: FOLDER, name: x, every: 0.02 Myr, times: [0.03 Myr]}\n"
                     "time: {end: 0.05 Myr}\ndiffusion: {parallel: 3e28 cm^2/s}\n" + rt.box(2, "open"))
    check_times("plane1", [0, 0.02, 0.03, 0.04, 0.05])
    # streaming and its heat, in a closed box
    compare("stream", "particles: plane.h5\noutput: {folder: FOLDER, name: x, every: 0.01 Myr}\n"
                      "time: {end: 0.02 Myr}\ndiffusion: {parallel: 3e27 cm^2/s}\n"
                      "streaming: {length: 50 pc}\n" + rt.box(2, "closed"))
    rt.write("solid.h5", clustered())
    # along and across, a power law and a record
    compare("solid", "particles: solid.h5\noutput: {folder: FOLDER, name: x, every: 0.003 Myr}\n"
                     "time: {end: 0.01 Myr}\ndiffusion:\n"
                     "  parallel: {power: {at: 3e28 cm^2/s, density: 1e-24 g/cm^3, density_index: -0.5}}\n"
                     "  perpendicular: record\ngeometry: {neighbours: 40}\n" + rt.box(3))
    rt.finish("ranks")


main()
