# SPDX-License-Identifier: GPL-3.0-or-later
# run_bad_input.py: each way to give `wend run` bad input is refused in a sentence that says where the fault is,
# on one rank and on two, and no file that was there before is touched.
import concurrent.futures
import hashlib
import os

import h5py
import numpy as np

import run_tool as rt

SETUP = {
    "particles": "good.h5",
    "output": "{folder: out, name: x, every: 0.01 Myr, checkpoint_every_steps: 5}",
    "time": "{end: 0.02 Myr}",
    "domain": "{lower: [0, 0], upper: [1 kpc, 1 kpc]}",
    "diffusion": "{parallel: 3e28 cm^2/s}",
}
POWER = "{parallel: {power: {at: 3e28 cm^2/s, density: 1e-24 g/cm^3, density_index: -0.5}}}"
VICTIM = 123  # the particle that is spoiled


def changed(**lines):
    """Text of the setup with some lines changed, None: left out."""
    return "".join(f"{k}: {v}\n" for k, v in {**SETUP, **lines}.items() if v is not None)


def good():
    """Particles without a record that some setups need."""
    records = rt.blob(2, 16)
    del records["massDensity"]
    return records


def spoiled(name, edit):
    """A copy of the good particle file, edited; returns its name."""
    rt.write(name, good())
    with h5py.File(rt.path(name), "r+") as f:
        edit(f, rt.species(f))
    return name


def add(gas, record, data):
    rt.put_record(gas, record, data, len(gas["id"]))


def spoil(record, value, filled=1.0):
    """Gives one particle of a record a bad value; the record is made if it is missing."""
    def edit(f, gas):
        if record not in gas:
            add(gas, record, np.full(len(gas["id"]), filled))
        gas[record][VICTIM] = value
    return edit


def drop(record):
    def edit(f, gas):
        del gas[record]
    return edit


def attribute(name, value):
    def edit(f, gas):
        f.attrs[name] = np.bytes_(value)
    return edit


def endless(f, gas):
    gas["magneticField/x"].attrs["value"] = np.inf


def shorten(f, gas):
    data = gas["cosmicRayEnergyDensity"][:-1]
    del gas["cosmicRayEnergyDensity"]
    add(gas, "cosmicRayEnergyDensity", data)


def empty(f, gas):
    for record in list(gas):
        del gas[record]
    none = np.zeros(0)
    for record in ("position", "positionOffset", "magneticField"):
        add_empty(gas, record, [none, none])
    add_empty(gas, "cosmicRayEnergyDensity", none)


def add_empty(gas, record, data):
    rt.put_record(gas, record, data, 0)


def wrong_dimension(f, gas):
    gas["magneticField"].attrs["unitDimension"] = np.array([-0.5, 0.5, -1, 0, 0, 0, 0])


def no_unit(f, gas):
    del gas["position/x"].attrs["unitSI"]


def other_species(f, gas):
    f.move("data/0/particles/gas", "data/0/particles/stars")


def wide_support(f, gas):
    data = np.full(len(gas["id"]), 0.1 * rt.KPC)
    data[VICTIM] = 0.6 * rt.KPC
    add(gas, "supportRadius", data)


def crowded(f, gas):
    """All but a few particles at one place: no support reaches the target."""
    for axis in "xy":
        gas[f"position/{axis}"][: len(gas["id"]) - 4] = 0.5 * rt.KPC


def not_hdf5(name):
    with open(rt.path(name), "w") as out:
        out.write("this is no HDF5 file\n" * 100)
    return name


# Setup text, and words that the error must hold: the file, the line or key or particle, the reason.
SETUPS = [
    (changed(diffusion="{paralel: 3e28 cm^2/s}"), ["line 5", "paralel"]),
    (changed(time="{end: 0.02 Myr}\nspeed: 3"), ["line 4", "speed"]),
    (changed(diffusion="{parallel: 3e28 cm/s}"), ["line 5", "diffusion.parallel", "cm/s"]),
    (changed(diffusion="{parallel: 3e28}"), ["line 5", "diffusion.parallel"]),
    (changed(diffusion="{parallel: -1 cm^2/s}"), ["line 5", "diffusion.parallel"]),
    (changed(time="{end: 0.02 parsec2}"), ["line 3", "time.end"]),
    (changed(time="{start: 1 Myr, end: 0.5 Myr}"), ["line 3", "time.end"]),
    (changed(time=None), ["time.end"]),
    (changed(particles=None), ["particles"]),
    (changed(output="{folder: out, name: x, times: [-1 Myr]}"), ["output.times", "starts"]),
    (changed(output="{folder: out, name: x, times: [3 Myr]}"), ["line 2", "output.times"]),
    (changed(output="{folder: out, name: x, every: 0 Myr}"), ["line 2", "output.every"]),
    (changed(output="{folder: out, name: a/b}"), ["line 2", "output.name"]),
    (changed(output="{folder: good.h5/out, name: x}"), ["output.folder", "good.h5"]),
    (changed(output="{folder: /proc/none, name: x}"), ["output.folder", "/proc/none"]),
    (changed(domain="{lower: [0, 0], upper: [1 kpc, 1 kpc], boundaries: [periodic, round]}"),
     ["line 4", "domain.boundaries", "round"]),
    (changed(domain="{lower: [0, 0], upper: [1 kpc, 1 kpc], boundaries: [periodic]}"), ["line 4", "boundaries"]),
    (changed(domain="{lower: [0, 0], upper: [1 kpc, -1 kpc]}"), ["line 4", "domain.upper"]),
    (changed(domain="{lower: [0, 0, 0], upper: [1 kpc, 1 kpc, 1 kpc]}"), ["3 axes", "good.h5", "2"]),
    (changed(domain="{lower: [0, 0], upper: [1 pc, 1 pc]}"), ["good.h5", "particle id", "outside the box"]),
    (changed(domain=None), ["domain", "good.h5", "no box"]),
    (changed(diffusion="{parallel: record}"), ["diffusion.parallel", "parallelDiffusivity", "good.h5"]),
    (changed(diffusion=POWER), ["diffusion.parallel", "massDensity", "good.h5"]),
    (changed(units="{mass: 1e60 kg}"), ["units", "single precision", "Msun"]),
    (changed(streaming="{length: 50 pc}"), ["streaming", "massDensity", "good.h5"]),
    (changed(streaming="{length: 50 pc, supports: 2}"), ["line 6", "streaming.supports", "streaming.length"]),
    (changed(stepping="{stages: 4}"), ["line 6", "stepping.stages", "even"]),
    (changed(geometry="{neighbours: 900}"), ["particle", "neighbours"]),
    (changed(particles="out/x_000001.h5"), ["output.name", "replace the particle file out/x_000001.h5"]),
    (changed(iteration=7), ["good.h5", "iteration", "7"]),
    (changed(particles="nowhere.h5"), ["nowhere.h5", "No such file"]),
    ("particles: [unfinished\n", ["line"]),
]

# How the particle file is spoiled, and words that the error must hold; FILE is its name, ID that of the victim.
FILES = [
    (spoil("mass", -1.0), ["FILE", "gas/mass", "ID", "greater than 0"]),
    (spoil("position/x", np.nan), ["FILE", "position/x", "ID"]),
    (endless, ["FILE", "magneticField/x", "particle id", "inf"]),
    (spoil("cosmicRayEnergyDensity", -1e-13), ["FILE", "cosmicRayEnergyDensity", "ID"]),
    (spoil("volume", 0.0, 1e55), ["FILE", "volume", "ID"]),
    (spoil("id", 0), ["id", "0"]),
    (drop("position"), ["FILE", "position"]),
    (drop("positionOffset"), ["FILE", "positionOffset"]),
    (drop("magneticField"), ["FILE", "magneticField", "missing"]),
    (drop("cosmicRayEnergyDensity"), ["FILE", "cosmicRayEnergy", "missing"]),
    (attribute("openPMD", "2.0.0"), ["FILE", "2.0.0"]),
    (attribute("basePath", "/elsewhere/%T/"), ["FILE", "basePath"]),
    (lambda f, gas: f.attrs.__delitem__("openPMD"), ["FILE", "openPMD"]),
    (shorten, ["FILE", "cosmicRayEnergyDensity", "length"]),
    (empty, ["FILE", "no particles"]),
    (wrong_dimension, ["FILE", "magneticField", "unitDimension"]),
    (no_unit, ["FILE", "position/x", "unitSI"]),
    (other_species, ["FILE", "gas", "missing"]),
    (wide_support, ["particle ID", "0.6", "period"]),
    (crowded, ["particle", "support"]),
]


def prepare_file(k, edit, words):
    """The setup of a spoiled file, and the words with names filled in."""
    name = spoiled(f"bad{k}.h5", edit)
    ids = rt.blob(2, 16)["id"]
    if edit is FILES[5][0]:  # the id of another particle
        with h5py.File(rt.path(name), "r+") as f:
            rt.species(f)["id"][VICTIM] = ids[7]
        words = ["id", str(ids[7]), "more than once"]
    return changed(particles=name), [w.replace("FILE", name).replace("ID", str(ids[VICTIM])) for w in words]


def snapshot():
    """Names, times of change and digests of all files in the folder of outputs."""
    found = {}
    for name in os.listdir(rt.path("out")):
        file = rt.path(f"out/{name}")
        with open(file, "rb") as data:
            found[name] = os.stat(file).st_mtime_ns, hashlib.sha256(data.read()).hexdigest()
    return found


def refuse(k, text, words, ranks):
    """Runs a bad setup; returns the message."""
    done = rt.wend(ranks, "run", f"bad{k}.yaml")
    said = [line for line in done.stderr.splitlines() if line.startswith("wend: ")]
    what = f"{text!r} on {ranks} ranks: {done.stderr or done.stdout}"
    rt.check(done.returncode == 1, f"status {done.returncode}: {what}")
    rt.check(len(said) == 1, f"{len(said)} messages: {what}")
    rt.check(done.stdout == "", f"something else was said: {done.stdout}")
    for word in words:
        rt.check(said and word in said[0], f"no \"{word}\" in the message: {what}")
    return said[0] if said else what


def main():
    rt.write("good.h5", good())
    rt.run(1, rt.setup("good.yaml", changed()), "--quiet")
    before = snapshot()
    rt.check(len(before) >= 9, f"outputs of the good run: {before}")
    cases = SETUPS + [prepare_file(k, *row) for k, row in enumerate(FILES)]
    cases.append((changed(particles=not_hdf5("text.h5")), ["text.h5", "no HDF5 file"]))
    for k, (text, _) in enumerate(cases):
        rt.setup(f"bad{k}.yaml", text)
    with concurrent.futures.ThreadPoolExecutor(4) as pool:  # mpirun waits more than it works
        tries = [pool.submit(refuse, k, *case, ranks) for k, case in enumerate(cases) for ranks in (1, 2)]
        for future in tries[::2]:
            print(future.result())
        for future in tries:
            future.result()
    done = rt.wend(2, "run", "good.yaml", "--fast")
    rt.check(done.returncode == 2 and "call it as" in done.stderr, f"unknown option: {done.stderr}")
    done = rt.wend(2, "run", "absent.yaml")
    rt.check(done.returncode == 1 and "absent.yaml" in done.stderr, f"absent setup: {done.stderr}")
    after = snapshot()
    rt.check(after == before, f"touched: {[f for f in {**before, **after} if before.get(f) != after.get(f)]}")
    print(f"{len(cases) + 2} cases")
    rt.finish("bad input")


main()
