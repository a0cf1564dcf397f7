# SPDX-License-Identifier: GPL-3.0-or-later
# run_books.py: the books of `wend run` close after ten thousand stages, in erg, with and without open borders.
import numpy as np

import run_tool as rt

# A super-step of 21 stages at its longest, 1000 of them.
TEXT = ("particles: blob.h5\noutput: {folder: FOLDER, name: x}\ntime: {end: 2 Gyr, steps: 1000}\n"
        "stepping: {fixed: 2 Gyr}\n")
DIFFUSION = "diffusion: {parallel: 3e28 cm^2/s, perpendicular: 3e26 cm^2/s}\n"
STREAMING = "diffusion: {parallel: 3e27 cm^2/s}\nstreaming: {length: 20 pc}\n"


def check_books(where, boundary, physics):
    """Returns what left through borders and what heated the gas, of the initial energy."""
    text = TEXT.replace("FOLDER", where) + physics + rt.box(2, boundary)
    rt.run(1, rt.setup(f"{where}.yaml", text), "--quiet")
    rows, _ = rt.ledger(where, "x")
    stages, initial = rows["stages"].sum(), rows["initial"][-1]
    worst = np.abs(rows["closure"]).max() / initial
    print(f"{where}: {stages:.0f} stages, worst closure {worst:.1e} of the initial energy, "
          f"{rows['escaped'][-1] / initial:.3g} escaped, {rows['streaming_heat'][-1] / initial:.3g} heat")
    rt.check(stages >= 10000, f"{where}: {stages} stages")
    # the balance is exact; each super-step rounds each energy once, which adds up like a random walk
    rt.check(worst <= 1e-14, f"{where}: closure {worst}")
    # columns, rounded once each, must add up to the closure by the last digit of the initial energy
    rest = rows["initial"] - rows["escaped"] - rows["streaming_heat"] - rows["now"] - rows["closure"]
    rt.check(np.abs(rest).max() <= 4e-16 * initial, f"{where}: rows do not add up: {np.abs(rest).max() / initial}")
    with rt.h5py.File(rt.path(f"{where}/{rt.outputs(where, 'x')[-1]}"), "r") as f:
        erg = 1e7 * rt.values(rt.species(f), "cosmicRayEnergy").sum()
    # numpy's sum of a thousand terms is good to some 1e-15
    rt.check(abs(rows["now"][-1] / erg - 1) < 1e-13, f"{where}: {rows['now'][-1]} erg booked, {erg} there")
    return rows["escaped"][-1] / initial, rows["streaming_heat"][-1] / initial


def main():
    rt.write("blob.h5", rt.blob(2, 24))
    rt.check(check_books("tight", "periodic", DIFFUSION) == (0, 0), "energy left a periodic box")
    rt.check(check_books("open", "open", DIFFUSION)[0] > 0.1, "nothing escaped from an open box")
    rt.check(check_books("heating", "closed", STREAMING)[1] > 0.01, "streaming heated nothing")
    rt.finish("books")


main()
