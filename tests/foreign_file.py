# SPDX-License-Identifier: GPL-3.0-or-later
# foreign_file.py: wend reads openPMD files that another writer made in its own way.
#
# Written with h5py after the standard alone: float32 places about a far corner with an offset, big-endian and
# unordered ids, constant components, other units, chunked and compressed data, integers for numbers, text of
# variable length, several iterations in a file. Expected values are worked out here in SI.
import h5py
import numpy as np

import particle_tool as pt

N = 37
PC = 3.0856775814913673e16
random = np.random.default_rng(5)


def attributes(thing, **values):
    for name, value in values.items():
        thing.attrs[name] = value


def component(group, name, data, unit, **how):
    data_set = group.create_dataset(name, data=data, **how)
    data_set.attrs["unitSI"] = np.float64(unit)
    return data_set


def constant(group, name, value, unit, shape):
    made = group.create_group(name)
    attributes(made, value=value, shape=np.array([shape], dtype="u8"), unitSI=np.float64(unit))
    return made


def record(thing, dimension, offset=0.0):
    attributes(thing, unitDimension=np.array(dimension + [0] * (7 - len(dimension)), dtype="f8"),
               timeOffset=np.float32(offset))


def vector(gas, name, dimension):
    group = gas.create_group(name)
    record(group, dimension)
    return group


def root(f, fixed, **more):
    """Root attributes as text of fixed or of variable length."""
    texts = {"openPMD": "1.0.1", "basePath": "/data/%T/", "particlesPath": "matter/", "author": "other hand",
             "iterationEncoding": "groupBased", "iterationFormat": "/data/%T/", **more}
    for name, text in texts.items():
        f.attrs[name] = np.bytes_(text) if fixed else text
    f.attrs["openPMDextension"] = np.uint32(0)


def species(f, iteration, time, dt, unit):
    step = f.create_group(f"data/{iteration}")
    attributes(step, time=time, dt=dt, timeUnitSI=np.float64(unit))
    f.create_group(f"data/{iteration}/matter/electrons")
    return step.create_group("matter/gas")


def write_rich(name):
    """Three dimensions, everything unusual at once. Returns the expected values in SI."""
    expected = {}
    with h5py.File(pt.path(name), "w", libver="latest") as f:
        root(f, fixed=False)
        species(f, 100, 1, 1, 1.0)
        gas = species(f, 2500, np.float32(0.5), 3, 3.1557e13)
        ids = random.permutation(10 * N)[:N].astype(">u4")
        gas.create_dataset("id", data=ids, chunks=(5,))
        place, offset = vector(gas, "position", [1]), vector(gas, "positionOffset", [1])
        for k, axis in enumerate("xyz"):
            near = random.uniform(-1, 1, N).astype(">f4" if axis == "y" else "<f4")
            component(place, axis, near, 0.5 * PC, chunks=(7,), compression="gzip", shuffle=True)
            if axis == "z":
                constant(offset, axis, np.int32(-4), 1e3 * PC, N)
                far = np.full(N, -4e3 * PC)
            else:
                cell = random.integers(10, 20, N).astype("i2")
                component(offset, axis, cell, 10 * PC)
                far = cell * (10 * PC)
            expected[axis] = near.astype("f8") * (0.5 * PC) + far
        field = vector(gas, "magneticField", [0, 1, -2, -1])
        for axis, value in zip("xyz", (np.float32(2.5), np.float64(-1), np.uint8(0))):
            constant(field, axis, value, 1e-10, N)  # microgauss in tesla
            # Gaussian B in units of (kg/m)^(1/2)/s, as wend's columns: tesla / sqrt(1e-7)
            expected["b" + axis] = np.full(N, float(value) * 1e-10 / np.sqrt(1e-7))
        mass = random.integers(1, 1000, N).astype(">i4")
        record(component(gas, "mass", mass, 2e33, fletcher32=True, chunks=(N,)), [0, 1])
        expected["mass"] = mass * 2e33
        density = random.uniform(1, 2, N).astype("f2")
        record(component(gas, "massDensity", density, 1.5e-21), [-3, 1])
        expected["density"] = density.astype("f8") * 1.5e-21
        energy = random.uniform(0, 1, N)
        record(component(gas, "cosmicRayEnergyDensity", energy, 1e-13), [-1, 1, -2])
        expected["energy"] = energy * 1e-13 * expected["mass"] / expected["density"]
        record(constant(gas, "supportRadius", np.float64(3), PC, N), [1])
        expected["support"] = np.full(N, 3 * PC)
        record(component(gas, "temperature", np.ones(N), 1.0), [0, 0, 0, 0, 1])  # not wend's: passed over
    return ids.astype(int), expected


def write_plane(name):
    """Two dimensions, no ids, energy a mass, fixed-length text, one iteration in a file of a series."""
    with h5py.File(pt.path(name), "w") as f:
        root(f, fixed=True, iterationEncoding="fileBased", iterationFormat="plane_%T.h5", openPMD="1.1.0")
        gas = species(f, 8, np.float64(2), np.float64(0.5), 10.0)
        place, offset = vector(gas, "position", [1]), vector(gas, "positionOffset", [1])
        x = random.uniform(0, 1, (2, N))
        for k, axis in enumerate("xy"):
            component(place, axis, x[k], 1.0)
            constant(offset, axis, 0.0, 1.0, N)
        record(component(gas, "mass", np.arange(1, N + 1, dtype="u1"), 2.0), [0, 1])
        record(component(gas, "cosmicRaySpecificEnergy", np.full(N, 7, dtype=">i8"), 0.5), [2, 0, -2])
        ids = np.arange(N)
    return ids, {"x": x[0], "y": x[1], "z": np.zeros(N), "mass": 2.0 * (ids + 1), "energy": 7.0 * (ids + 1)}


def compare(name, facts, rows, ids, expected):
    pt.check(rows is not None, f"{name}: {facts}")
    if rows is None:
        return
    pt.check(sorted(rows) == sorted(ids), f"{name}: ids")
    for column in expected:
        found = np.array([rows[k][column] for k in ids])
        # a few roundings: units are combined in another order here
        good = np.allclose(found, expected[column], rtol=4e-16 * 4, atol=0)
        pt.check(good, f"{name}: {column}: {found[:3]} for {expected[column][:3]}")
    pt.check(set(rows[ids[0]]) == set(expected), f"{name}: columns {set(rows[ids[0]]) ^ set(expected)}")


def broken(name, edit, word):
    """A rich file with one thing broken must be refused with a word in the error."""
    write_rich(name)
    with h5py.File(pt.path(name), "r+") as f:
        edit(f, f["data/2500/matter/gas"])
    facts, rows = pt.read(2, name)
    pt.check(rows is None and word in facts, f"{name}: {facts}")


def negative_id(f, gas):
    del gas["id"]
    gas.create_dataset("id", data=np.arange(N) - 1)


def two_dimensional(f, gas):
    del gas["mass"]
    record(component(gas, "mass", np.ones((N, 1)), 1.0), [0, 1])


def main():
    ids, expected = write_rich("rich.h5")
    for ranks in (1, 3):
        facts, rows = pt.read(ranks, "rich.h5")
        compare("rich.h5", facts, rows, ids, expected)
        if rows is not None:
            pt.check(facts["iteration"] == "2500" and facts["dim"] == "3", f"rich.h5: {facts}")
            pt.check(float.fromhex(facts["time"]) == 0.5 * 3.1557e13, "rich.h5: time")
            pt.check(float.fromhex(facts["dt"]) == 3 * 3.1557e13, "rich.h5: dt")
            pt.check(facts["density"] == "0" and facts["domain"] == "0", "rich.h5: facts")
    facts, rows = pt.read(1, "rich.h5", 100)
    pt.check(rows is None and "position/x is missing" in facts, f"iteration 100: {facts}")
    ids, expected = write_plane("plane_8.h5")
    facts, rows = pt.read(2, "plane_8.h5")
    compare("plane_8.h5", facts, rows, ids, expected)
    pt.check(rows is None or (facts["dim"] == "2" and facts["iteration"] == "8"), "plane_8.h5: facts")
    broken("major.h5", lambda f, gas: f.attrs.__setitem__("openPMD", "2.0.0"), "openPMD 2.0.0")
    broken("negative.h5", negative_id, "negative")
    broken("square.h5", two_dimensional, "more than one dimension")
    broken("nomass.h5", lambda f, gas: gas.__delitem__("position"), "position/x is missing")
    broken("shape.h5", lambda f, gas: gas["supportRadius"].attrs.__delitem__("shape"), "value and shape")
    broken("gauss.h5", lambda f, gas: gas["magneticField"].attrs.__setitem__(
        "unitDimension", np.array([-0.5, 0.5, -1, 0, 0, 0, 0])), "magneticField has another unitDimension")
    pt.finish("foreign files")


main()
