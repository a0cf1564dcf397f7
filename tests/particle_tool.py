# SPDX-License-Identifier: GPL-3.0-or-later
# particle_tool.py: what the tests of particle files in Python share: a folder, and tests/particle_tool.
import atexit
import os
import shutil
import subprocess
import sys
import tempfile

folder = tempfile.mkdtemp(prefix="wend_test_")
atexit.register(shutil.rmtree, folder, ignore_errors=True)
tool = os.path.join(os.environ.get("builddir", "."), "tests", "particle_tool")
failures = []


def path(name):
    return os.path.join(folder, name)


def run(ranks, *words, date=None):
    """Runs the tool and returns whether all went well, and what it printed."""
    environment = dict(os.environ)
    if date is not None:
        environment["SOURCE_DATE_EPOCH"] = str(date)
    done = subprocess.run(["mpirun", "-n", str(ranks), tool, *map(str, words)], env=environment,
                          stdin=subprocess.DEVNULL, stdout=subprocess.PIPE, text=True)
    return done.returncode == 0 and not done.stdout.startswith("error:"), done.stdout


def read(ranks, name, iteration=-1):
    """Reads a file with wend; returns the facts and, by id, the values of each column in SI.

    Where wend refuses the file: its error, and None.
    """
    good, text = run(ranks, "read", path(name), iteration)
    if not good:
        return text.strip(), None
    lines = text.splitlines()
    facts = dict(word.split("=") for word in lines[0].split() if "=" in word)
    rows = {}
    for line in lines[1:]:
        number, *words = line.split()
        rows[int(number)] = {k: float.fromhex(v) for k, v in (w.split("=") for w in words)}
    return facts, rows


def check(good, what):
    """Notes a failure and goes on."""
    if not good:
        failures.append(what)
        print("FAILED:", what)


def finish(what):
    print(f"{what}: {len(failures)} failures")
    sys.exit(1 if failures else 0)
