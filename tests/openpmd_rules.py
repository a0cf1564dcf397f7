# SPDX-License-Identifier: GPL-3.0-or-later
# openpmd_rules.py: the rules of openPMD 1.1.0 for particle files, checked on what wend writes.
#
#     openpmd_rules.py [FILE...]      checks files; without any, files that tests/particle_tool writes
#
# Rules are those of the base standard (https://www.openpmd.org, version 1.1.0, 2018); records and their
# dimensions beyond it are wend's own and are listed below.
import os
import re
import shutil
import sys
import xml.etree.ElementTree

import h5py
import numpy as np

import particle_tool as pt

# Powers of length, mass, time, current, temperature, amount, luminous intensity.
DIMENSIONS = {
    "position": (1, 0, 0, 0, 0, 0, 0),
    "positionOffset": (1, 0, 0, 0, 0, 0, 0),
    "id": (0, 0, 0, 0, 0, 0, 0),
    "supportRadius": (1, 0, 0, 0, 0, 0, 0),
    "mass": (0, 1, 0, 0, 0, 0, 0),
    "massDensity": (-3, 1, 0, 0, 0, 0, 0),
    "magneticField": (0, 1, -2, -1, 0, 0, 0),
    "specificInternalEnergy": (2, 0, -2, 0, 0, 0, 0),
    "velocity": (1, 0, -1, 0, 0, 0, 0),
    "cosmicRayEnergy": (2, 1, -2, 0, 0, 0, 0),
    "volume": (3, 0, 0, 0, 0, 0, 0),
    "parallelDiffusivity": (2, 0, -1, 0, 0, 0, 0),
    "perpendicularDiffusivity": (2, 0, -1, 0, 0, 0, 0),
    "ionisedFraction": (0, 0, 0, 0, 0, 0, 0),
    "electronNumberDensity": (-3, 0, 0, 0, 0, 0, 0),
    "cosmicRaySource": (2, 1, -3, 0, 0, 0, 0),
    "gammaRayLuminosity": (2, 1, -3, 0, 0, 0, 0),
}
VECTORS = ("position", "positionOffset", "magneticField", "velocity")
NAME = re.compile(r"^[A-Za-z0-9_]+$")


class Rules:
    """Checks one file; every broken rule is a failure that names file and object."""

    def __init__(self, name):
        self.name = name
        self.file = h5py.File(name, "r")

    def check(self, good, what):
        pt.check(good, f"{os.path.basename(self.name)}: {what}")

    def text(self, thing, name):
        """A text attribute must be fixed-length ASCII."""
        if name not in thing.attrs:
            self.check(False, f"{thing.name} has no attribute {name}")
            return ""
        kind = thing.attrs.get_id(name).get_type()
        fixed = isinstance(kind, h5py.h5t.TypeStringID) and not kind.is_variable_str()
        self.check(fixed and kind.get_cset() == h5py.h5t.CSET_ASCII, f"{thing.name}@{name} is no fixed ASCII")
        value = thing.attrs[name]
        return value.decode("ascii") if isinstance(value, bytes) else str(value)

    def number(self, thing, name, kinds="f", size=None, shape=()):
        """A number attribute of a kind of numpy, a size in bytes, and a shape."""
        if name not in thing.attrs:
            self.check(False, f"{thing.name} has no attribute {name}")
            return np.zeros(shape)
        value = np.asarray(thing.attrs[name])
        self.check(value.dtype.kind in kinds and size in (None, value.dtype.itemsize),
                   f"{thing.name}@{name} has type {value.dtype}")
        self.check(value.shape == shape, f"{thing.name}@{name} has shape {value.shape}")
        self.check(np.all(np.isfinite(value)), f"{thing.name}@{name} is not finite")
        return value

    def root(self):
        f = self.file
        self.check(self.text(f, "openPMD") == "1.1.0", "openPMD is not 1.1.0")
        self.check(self.number(f, "openPMDextension", "u", 4) == 0, "openPMDextension is not 0")
        self.check(self.text(f, "basePath") == "/data/%T/", "basePath is not /data/%T/")
        self.check(self.text(f, "particlesPath") == "particles/", "particlesPath")
        self.check("meshesPath" not in f.attrs, "meshesPath without meshes")
        for name in ("author", "software", "softwareVersion"):
            self.check(self.text(f, name) != "", f"{name} is empty")
        date = self.text(f, "date")
        self.check(re.match(r"^\d{4}-\d\d-\d\d \d\d:\d\d:\d\d [+-]\d{4}$", date), f"date {date}")
        for part in self.text(f, "softwareDependencies").split(";"):
            self.check(part.strip() != "", "an empty entry in softwareDependencies")
        self.encoding()

    def encoding(self):
        encoding, form = self.text(self.file, "iterationEncoding"), self.text(self.file, "iterationFormat")
        if encoding == "groupBased":
            self.check(form == "/data/%T/", f"iterationFormat {form}")
        elif encoding == "fileBased":
            pattern = re.escape(form).replace("%T", r"(\d+)")
            pattern = re.sub(r"%0(\d+)T", r"(\\d{\1,})", pattern)
            found = re.match(f"^{pattern}$", os.path.basename(self.name))
            self.check(found is not None, f"{form} is not the form of the file name")
            self.check(len(self.file["data"]) == 1, "more than one iteration in a file of a series")
            self.check(found and str(int(found.group(1))) in self.file["data"], "another iteration in the name")
        else:
            self.check(False, f"iterationEncoding {encoding}")

    def iterations(self):
        self.check("data" in self.file and len(self.file["data"]) > 0, "no iteration")
        for number, group in self.file["data"].items():
            self.check(number.isdigit(), f"iteration {number} is no number")
            self.number(group, "time")
            self.number(group, "dt")
            self.check(self.number(group, "timeUnitSI", "f", 8) > 0, "timeUnitSI")
            self.check(list(group["particles"]) == ["gas"], "species other than gas")
            self.species(group["particles/gas"])

    def record_facts(self, record, name):
        self.check(tuple(self.number(record, "unitDimension", "f", 8, (7,))) == DIMENSIONS[name],
                   f"unitDimension of {name}")
        self.number(record, "timeOffset")

    def component(self, thing, count):
        """Data, or value and shape of a constant; unitSI in both cases. Returns its values."""
        self.check(self.number(thing, "unitSI", "f", 8) > 0, f"unitSI of {thing.name}")
        if isinstance(thing, h5py.Dataset):
            self.check(thing.shape == (count,), f"{thing.name} has shape {thing.shape}")
            return thing[()]
        self.check(len(thing) == 0, f"{thing.name}: a constant component holds something")
        self.check(tuple(self.number(thing, "shape", "u", 8, (1,))) == (count,), f"shape of {thing.name}")
        return np.full(count, self.number(thing, "value", "fiu"))

    def species(self, gas):
        count = gas["position/x"].shape[0]
        axes = ["x", "y", "z"] if "z" in gas["position"] else ["x", "y"]
        for required in ("position", "positionOffset"):
            self.check(required in gas and sorted(gas[required]) == axes, f"{required} has other axes")
        for name, record in gas.items():
            self.check(NAME.match(name), f"name {name}")
            if name == "particlePatches":
                continue
            self.check(name in DIMENSIONS, f"record {name} is unknown")
            if name not in DIMENSIONS:
                continue
            self.record_facts(record, name)
            parts = [record] if name not in VECTORS else list(record.values())
            if name in VECTORS:
                self.check(set(record) <= set("xyz") and {"x", "y"} <= set(record), f"axes of {name}")
            for part in parts:
                self.check(np.all(np.isfinite(self.component(part, count))), f"{part.name} is not finite")
        if "id" in gas:
            ids = gas["id"][()]
            self.check(ids.dtype == np.uint64 and len(np.unique(ids)) == count, "ids are not unique uint64")
        if count > 0:
            self.check("particlePatches" in gas, "no particlePatches")
            self.patches(gas, axes, count)

    def patches(self, gas, axes, count):
        """Stretches that cover all particles in order; boxes that hold theirs, lower bound inside."""
        group = gas["particlePatches"]
        number, first = group["numParticles"], group["numParticlesOffset"]
        self.check(number.dtype == np.uint64 and first.dtype == np.uint64, "type of the patches' numbers")
        n = number[()].astype(int)
        self.check(n.sum() == count and np.array_equal(first[()], np.cumsum(n) - n), "patches leave gaps")
        for name in ("offset", "extent"):
            self.check(sorted(group[name]) == axes, f"axes of {name}")
            self.record_facts(group[name], "position")
            for axis in axes:
                self.check(group[name][axis].shape == n.shape, f"{name}/{axis} has another length")
                self.number(group[name][axis], "unitSI", "f", 8)
        for axis in axes:
            x = gas["position"][axis][()] * gas["position"][axis].attrs["unitSI"]
            low = group["offset"][axis][()] * group["offset"][axis].attrs["unitSI"]
            high = low + group["extent"][axis][()] * group["extent"][axis].attrs["unitSI"]
            patch = np.repeat(np.arange(len(n)), n)
            # unitSI moves both ends by a rounding
            slack = 4e-16 * np.max(np.abs(x))
            self.check(np.all(x >= low[patch] - slack) and np.all(x < high[patch] + slack), f"patches along {axis}")
        self.apart(group, axes, n)

    def apart(self, group, axes, n):
        """No two patches overlap."""
        low = np.stack([group["offset"][a][()] for a in axes])
        high = low + np.stack([group["extent"][a][()] for a in axes])
        for k in range(len(n)):
            meets = np.all((low < high[:, k:k + 1]) & (high > low[:, k:k + 1]), axis=0)
            self.check(meets.sum() == 1, f"patch {k} overlaps another")

    def names(self):
        """Whatever does not fit the standard stays out of /data, and names are plain."""
        self.check(set(self.file) <= {"data", "wend"}, f"groups {list(self.file)}")
        self.file["data"].visit(lambda name: self.check(all(map(NAME.match, name.split("/"))), name))

    def companion(self):
        """The XDMF file is XML that names data sets of this file with their length and type."""
        name = self.name[:-3] + ".xmf"
        self.check(os.path.exists(name), "no companion")
        if not os.path.exists(name):
            return
        grid = xml.etree.ElementTree.parse(name).getroot().find("Domain/Grid")
        count = grid.find("Topology").get("NumberOfElements")
        self.check(grid.find("Topology").get("TopologyType") == "Polyvertex", "topology")
        named = set()
        for item in grid.iter("DataItem"):
            if item.get("Format") != "HDF":
                self.check(item.get("Function", "").startswith("JOIN"), "a function other than JOIN")
                continue
            file, inside = item.text.strip().split(":")
            data = h5py.File(os.path.join(os.path.dirname(self.name), file), "r")[inside]
            kind = {"Float": "f", "Int": "u"}[item.get("NumberType")]
            self.check(item.get("Dimensions") == count == str(data.shape[0]), f"length of {inside}")
            self.check(data.dtype.kind == kind and str(data.dtype.itemsize) == item.get("Precision"),
                       f"type of {inside}")
            named.add(data.name)
        self.everything_named(named)

    def everything_named(self, named):
        there = set()
        for group in self.file["data"].values():
            group["particles/gas"].visititems(
                lambda name, thing: there.add(thing.name) if isinstance(thing, h5py.Dataset) else None)
        there = {name for name in there if "particlePatches" not in name}
        self.check(named == there, f"the companion lacks or invents {named ^ there}")

    def all(self):
        self.root()
        self.iterations()
        self.names()
        self.companion()


def own_group(name, bare):
    """Box, setup and version, outside /data."""
    own = h5py.File(name, "r")["wend"]
    pt.check(own.attrs["version"] != b"" and own.attrs["git"] != b"", f"{name}: version")
    pt.check(("setup" in own) == ("domain" in own) == (not bare), f"{name}: setup and box")
    if not bare:
        text = own["setup"][0]
        pt.check(text == b"# text of a setup\nparticles: a\n", f"{name}: setup text {text}")


def data_sets(name):
    """Bytes of each data set."""
    found = {}
    h5py.File(name, "r").visititems(
        lambda path, thing: found.update({path: (str(thing.dtype), thing.shape, thing[()].tobytes())})
        if isinstance(thing, h5py.Dataset) else None)
    return found


def written_by_wend():
    for dim in (2, 3):
        for name, count, iteration, extra in (("run_0007.h5", 500, 7, []), ("run_7.h5", 500, 7, []),
                                              ("start.h5", 64, 0, []), ("bare.h5", 10, 3, ["bare"]),
                                              ("none_1.h5", 0, 1, [])):
            names = []
            for ranks in (1, 3):
                file = pt.path(f"{dim}d_on_{ranks}_{name}")
                good, text = pt.run(ranks, "write", file, dim, count, iteration, *extra, date=1700000000)
                pt.check(good, f"{file}: {text}")
                Rules(file).all()
                own_group(file, bool(extra))
                names.append(file)
            one, three = map(data_sets, names)
            pt.check(one == three, f"{name}: data sets depend on the number of ranks")
        gas = h5py.File(pt.path(f"{dim}d_on_1_run_7.h5"), "r")
        pt.check(gas.attrs["date"] == b"2023-11-14 22:13:20 +0000", f"fixed date: {gas.attrs['date']}")
        gas = gas["data/7/particles/gas"]
        # 500 particles that fill the box: each of the 64 cells has some
        pt.check(gas["particlePatches/numParticles"].shape == (64,), "64 patches")
        pt.check(("z" in gas["magneticField"]) == (dim == 3), "z of a field that lies in the plane")


def set_attribute(where, name, value):
    def edit(f):
        f[where].attrs[name] = value
    return edit


def drop_attribute(where, name):
    def edit(f):
        del f[where].attrs[name]
    return edit


def same_ids(f):
    ids = f["data/7/particles/gas/id"]
    ids[1] = ids[0]


def move_patch(f):
    f["data/7/particles/gas/particlePatches/offset/x"][3] += 0.01


def shift_patch(f):
    f["data/7/particles/gas/particlePatches/numParticles"][3] += 1


def rules_notice(name):
    """Each rule broken on purpose must be noticed, or the checks above would say nothing."""
    gas = "data/7/particles/gas/"
    edits = [
        set_attribute("/", "openPMD", np.bytes_("1.0.0")), set_attribute("/", "openPMD", "1.1.0"),
        set_attribute("/", "openPMDextension", np.int32(0)), set_attribute("/", "date", np.bytes_("today")),
        set_attribute("/", "iterationFormat", np.bytes_("other_%T.h5")), drop_attribute("/", "author"),
        set_attribute("data/7", "timeUnitSI", np.float32(1)), drop_attribute("data/7", "dt"),
        drop_attribute(gas + "mass", "timeOffset"), drop_attribute(gas + "position/y", "unitSI"),
        set_attribute(gas + "mass", "unitDimension", np.zeros(7)), drop_attribute(gas + "velocity", "unitDimension"),
        set_attribute(gas + "positionOffset/x", "shape", np.array([3], dtype="u8")),
        drop_attribute(gas + "positionOffset/x", "value"), same_ids, move_patch, shift_patch,
        lambda f: f.create_group(gas + "other-name"), lambda f: f.create_group("more"),
        lambda f: f.__delitem__(gas + "volume"), lambda f: f.create_group("data/8"),
        lambda f: f.__delitem__(gas + "particlePatches"), lambda f: f.__delitem__(gas + "positionOffset/y"),
    ]
    for number, edit in enumerate(edits):
        broken = pt.path(f"broken{number}_run_7.h5")
        shutil.copy(name, broken)
        with open(name[:-3] + ".xmf") as good, open(broken[:-3] + ".xmf", "w") as other:
            other.write(good.read().replace(os.path.basename(name), os.path.basename(broken)))
        with h5py.File(broken, "r+") as f:
            f.attrs["iterationFormat"] = np.bytes_(f"broken{number}_run_%T.h5")
            edit(f)
        noticed = Rules(broken)
        noticed.failures = []
        noticed.check = lambda good, what, to=noticed.failures: good or to.append(what)
        try:
            noticed.all()
        except Exception as error:  # a file so broken that the checks stumble
            noticed.failures.append(str(error))
        pt.check(len(noticed.failures) > 0, f"broken rule {number} was not noticed")


if __name__ == "__main__":
    for file in sys.argv[1:]:
        Rules(file).all()
    if len(sys.argv) == 1:
        written_by_wend()
        rules_notice(pt.path("3d_on_1_run_7.h5"))
    pt.finish("openPMD rules")
