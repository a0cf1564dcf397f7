# SPDX-License-Identifier: GPL-3.0-or-later
# run_books.py: the books of `wend run` close after ten thousand stages, in erg, with and without open borders.
import numpy as np

import run_tool as rt

# A super-step of 21 stages at its longest, 1000 of them.
TEXT = ("particles: blob.h5\noutput: {folder: FOLDER, name: x}\ntime: {end: 2 Gyr, steps: 1000}\n"
        "diffusion: {parallel: 3e28 cm^2/s, perpendicular: 3e26 cm^2/s}\nstepping: {fixed: 2 Gyr}\n")


def check_books(where, boundary):
    rt.run(1, rt.setup(f"{where}.yaml", TEXT.replace("FOLDER", where) + rt.box(2, boundary)), "--quiet")
    rows, _ = rt.ledger(where, "x")
    stages, initial = rows["stages"].sum(), rows["initial"][-1]
    worst = np.abs(rows["closure"]).max() / initial
    print(f"{boundary}: {stages:.0f} stages, worst closure {worst:.1e} of the initial energy, "
          f"{rows['escaped'][-1] / initial:.3g} escaped")
    rt.check(stages >= 10000, f"{boundary}: {stages} stages")
    # the balance is exact; each super-step rounds each energy once, which adds up like a random walk
    rt.check(worst <= 1e-14, f"{boundary}: closure {worst}")
    # columns, rounded once each, must add up to the closure by the last digit of the initial energy
    rest = rows["initial"] - rows["escaped"] - rows["now"] - rows["closure"]
    rt.check(np.abs(rest).max() <= 4e-16 * initial, f"{boundary}: rows do not add up: {np.abs(rest).max() / initial}")
    with rt.h5py.File(rt.path(f"{where}/{rt.outputs(where, 'x')[-1]}"), "r") as f:
        erg = 1e7 * rt.values(rt.species(f), "cosmicRayEnergy").sum()
    # numpy's sum of a thousand terms is good to some 1e-15
    rt.check(abs(rows["now"][-1] / erg - 1) < 1e-13, f"{boundary}: {rows['now'][-1]} erg booked, {erg} there")
    return rows["escaped"][-1] / initial


def main():
    rt.write("blob.h5", rt.blob(2, 24))
    rt.check(check_books("closed", "periodic") == 0, "energy escaped from a periodic box")
    rt.check(check_books("open", "open") > 0.1, "nothing escaped from an open box")
    rt.finish("books")


main()
