# SPDX-License-Identifier: GPL-3.0-or-later
# run_tool.py: what the tests of `wend run` share: particle files written with h5py, setups, calls, digests.
import atexit
import hashlib
import os
import shutil
import subprocess
import sys
import tempfile

import h5py
import numpy as np

KPC = 3.0856775814913673e19  # m
MYR = 1e6 * 365.25 * 86400  # s
GAUSS = 1e-4  # T

folder = tempfile.mkdtemp(prefix="wend_test_")
atexit.register(shutil.rmtree, folder, ignore_errors=True)
program = os.path.join(os.environ.get("builddir", "."), "wend")
failures = []


def path(name):
    return os.path.join(folder, name)


def check(good, what):
    """Notes a failure and goes on."""
    if not good:
        failures.append(what)
        print("FAILED:", what, flush=True)


def finish(what):
    print(f"{what}: {len(failures)} failures")
    sys.exit(1 if failures else 0)


# ---- particle files, in SI ----------------------------------------------------------------------

DIMENSIONS = {
    "position": [1], "positionOffset": [1], "magneticField": [0, 1, -2, -1], "id": [0], "mass": [0, 1],
    "massDensity": [-3, 1], "supportRadius": [1], "volume": [3], "cosmicRayEnergy": [2, 1, -2],
    "cosmicRayEnergyDensity": [-1, 1, -2], "cosmicRaySpecificEnergy": [2, 0, -2],
    "parallelDiffusivity": [2, 0, -1], "perpendicularDiffusivity": [2, 0, -1], "velocity": [1, 0, -1],
}


def put_component(group, name, data, unit=1.0, count=None):
    """A data set, or a constant component where data is a number."""
    if np.isscalar(data):
        made = group.create_group(name)
        made.attrs["value"] = float(data)
        made.attrs["shape"] = np.array([count], dtype="u8")
    else:
        made = group.create_dataset(name, data=data)
    made.attrs["unitSI"] = float(unit)
    return made


def put_facts(record, name):
    dimension = DIMENSIONS[name]
    record.attrs["unitDimension"] = np.array(dimension + [0] * (7 - len(dimension)), dtype="f8")
    record.attrs["timeOffset"] = 0.0


def put_record(gas, name, data, count):
    """A scalar record, or a vector one where data is a list of components."""
    if isinstance(data, list):
        record = gas.create_group(name)
        for axis, component in zip("xyz", data):
            put_component(record, axis, component, count=count)
    else:
        record = put_component(gas, name, data, count=count)
    put_facts(record, name)


def write(name, records, time=0.0):
    """Writes records in SI, {name: array, number or list of these}, as one iteration."""
    with h5py.File(path(name), "w") as f:
        for key, text in {"openPMD": "1.1.0", "basePath": "/data/%T/", "particlesPath": "particles/",
                          "iterationEncoding": "groupBased", "iterationFormat": "/data/%T/"}.items():
            f.attrs[key] = np.bytes_(text)
        f.attrs["openPMDextension"] = np.uint32(0)
        step = f.create_group("data/0")
        step.attrs["time"], step.attrs["dt"], step.attrs["timeUnitSI"] = time, 0.0, 1.0
        gas = step.create_group("particles/gas")
        count = len(records["position"][0])
        for key, data in records.items():
            put_record(gas, key, data, count)


def lattice(dim, side, jitter, seed=1):
    """Positions [n, dim] in [0, 1) on a jittered lattice."""
    random = np.random.default_rng(seed)
    cells = np.indices((side,) * dim).reshape(dim, -1).T + 0.5
    return ((cells + jitter * (2 * random.random(cells.shape) - 1)) / side) % 1.0


def blob(dim, side, jitter=0.2, width=0.1, floor=1e-3, seed=1):
    """A Gaussian of CR energy density in a box of 1 kpc with an oblique field of 3 uG."""
    x = lattice(dim, side, jitter, seed)
    density = 1e-13 * (np.exp(-((x - 0.5) ** 2).sum(1) / (2 * width**2)) + floor)
    angle = 0.4
    field = [3e-6 * GAUSS * np.cos(angle), 3e-6 * GAUSS * np.sin(angle), 0.0]
    return {
        "position": [KPC * c for c in x.T],
        "positionOffset": [0.0] * dim,
        "magneticField": field,
        "id": np.random.default_rng(seed + 1).permutation(10 * len(x))[: len(x)].astype("u8"),
        "massDensity": 1e-25,  # thin: 3 uG make an Alfven speed of 0.87 kpc/Myr
        "cosmicRayEnergyDensity": density,
    }


# ---- setups and calls -----------------------------------------------------------------------------

def box(dim, boundary="periodic"):
    return (f"domain: {{lower: [{', '.join(['0'] * dim)}], upper: [{', '.join(['1 kpc'] * dim)}], "
            f"boundaries: [{', '.join([boundary] * dim)}]}}\n")


def setup(name, text):
    with open(path(name), "w") as out:
        out.write(text)
    return path(name)


def command(ranks, *words):
    launcher = ["mpirun", "-n", str(ranks)] if ranks > 1 else []
    return [*launcher, program, *map(str, words)]


def wend(ranks, *words):
    """Runs wend in the folder of the test."""
    return subprocess.run(command(ranks, *words), cwd=folder, stdin=subprocess.DEVNULL,
                          stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)


def run(ranks, *words):
    """Runs `wend run`, which must succeed, or there is nothing to go on with."""
    done = wend(ranks, "run", *words)
    check(done.returncode == 0, f"wend run {words} on {ranks} ranks: {done.stderr}")
    if done.returncode != 0:
        finish("stopped")
    return done


# ---- results --------------------------------------------------------------------------------------

def outputs(where, name):
    """Names of the output files in a folder, in order."""
    found = [f for f in os.listdir(path(where)) if f.startswith(name + "_") and f.endswith(".h5")]
    return sorted(f for f in found if f[len(name) + 1:-3].isdigit())


def digest(file):
    """Digest of the bytes of all data sets but the setup's text."""
    total = hashlib.sha256()

    def visit(name, thing):
        if isinstance(thing, h5py.Dataset) and name != "wend/setup":
            total.update(f"{name} {thing.dtype} {thing.shape}".encode() + thing[()].tobytes())

    with h5py.File(file, "r") as f:
        f.visititems(visit)
    return total.hexdigest()


def digests(where, name):
    return [(f, digest(path(f"{where}/{f}"))) for f in outputs(where, name)]


def species(file):
    """Group of the only species of an open file."""
    return next(iter(file["data"].values()))["particles/gas"]


def values(gas, record):
    """Values of a record or component in SI."""
    thing = gas[record]
    if isinstance(thing, h5py.Dataset):
        return thing[()] * thing.attrs["unitSI"]
    return np.full(thing.attrs["shape"][0], thing.attrs["value"] * thing.attrs["unitSI"])


def ledger(where, name):
    """The books as {column: array}, the cause as text, and the bytes of the file."""
    with open(path(f"{where}/{name}_ledger.tsv"), "rb") as file:
        raw = file.read()
    lines = [line for line in raw.decode().splitlines() if not line.startswith("#")]
    titles = lines[0].split("\t")
    columns = zip(*(line.split("\t") for line in lines[1:]))
    return {t: list(c) if t == "cause" else np.array(c, dtype=float)
            for t, c in zip(titles, columns)}, raw
