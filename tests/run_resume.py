# SPDX-License-Identifier: GPL-3.0-or-later
# run_resume.py: a run that is killed at random moments and resumed, each time on another number of ranks, ends
# with the bytes of an undisturbed one; damaged and foreign checkpoints are refused.
import os
import random
import shutil
import signal
import subprocess
import time

import run_tool as rt

KILLS = 10
RESUMED = 5  # kills after which a checkpoint must have been there
SEED = int.from_bytes(os.urandom(2), "big")
# Three stages at most make many super-steps; accuracy, stages, outputs and bounds set their lengths.
TEXT = ("particles: blob.h5\noutput: {folder: FOLDER, name: x, every: 0.05 Myr, checkpoint_every_steps: 6}\n"
        "time: {end: 0.3 Myr}\ndiffusion: {parallel: 3e28 cm^2/s}\nstreaming: {length: 20 pc}\n"
        "stepping: {tolerance: 1e-5, stages: 3}\n" + rt.box(2, "open"))


def children(parent):
    with open(f"/proc/{parent}/task/{parent}/children") as file:
        return [int(word) for word in file.read().split()]


def kill(process):
    """kill -9 for a run and each of its ranks; false where it had ended already."""
    if process.poll() is not None:
        return False
    for victim in (*children(process.pid), process.pid):
        try:
            os.kill(victim, signal.SIGKILL)
        except ProcessLookupError:
            pass
    process.wait()
    return True


def steps_on_disk(where):
    try:
        with open(rt.path(f"{where}/x_ledger.tsv")) as file:
            return max(0, file.read().count("\n") - 2)
    except FileNotFoundError:
        return 0


def torment(setup, whole):
    """Kills a run at random moments until KILLS of them hit, RESUMED of them runs that had resumed.

    whole: seconds of an undisturbed run.
    """
    chance, hits, resumed, tries = random.Random(SEED), 0, 0, 0
    while (hits < KILLS or resumed < RESUMED) and tries < 4 * KILLS:
        tries += 1
        ranks = chance.randint(1, 4)
        process = subprocess.Popen(rt.command(ranks, "run", setup, "--resume", "--quiet"), cwd=rt.folder,
                                   stdin=subprocess.DEVNULL, stdout=subprocess.DEVNULL,
                                   stderr=subprocess.DEVNULL)
        had = os.path.exists(rt.path("killed/x_checkpoint.h5"))
        time.sleep(chance.uniform(0.1, 0.7) * whole)
        if kill(process):
            hits += 1
            resumed += had
            print(f"killed on {ranks} ranks, {steps_on_disk('killed')} rows in the ledger", flush=True)
        else:  # it came to its end: begin again
            shutil.rmtree(rt.path("killed"))
    rt.check(hits >= KILLS and resumed >= RESUMED, f"only {hits} kills hit, {resumed} of them resumed runs")


def refused(setup, word, what):
    for ranks in (1, 2):
        done = rt.wend(ranks, "run", setup, "--resume")
        rt.check(done.returncode != 0 and word in done.stderr and "x_checkpoint.h5" in done.stderr,
                 f"{what} on {ranks} ranks: {done.stderr}")


def damage(setup):
    """Flips one bit in the middle of the checkpoint's largest column."""
    file = rt.path("whole/x_checkpoint.h5")
    with rt.h5py.File(file, "r") as f:
        offset = f["columns/cosmicRayEnergy"].id.get_offset()
    with open(file, "r+b") as f:
        f.seek(offset + 1000)
        byte = f.read(1)[0]
        f.seek(offset + 1000)
        f.write(bytes([byte ^ 4]))
    refused(setup, "cosmicRayEnergy is damaged", "a flipped bit")
    os.truncate(file, os.path.getsize(file) // 2)
    refused(setup, "truncated", "half a checkpoint")


def main():
    print("seed", SEED)
    rt.write("blob.h5", rt.blob(2, 52))
    whole = rt.setup("whole.yaml", TEXT.replace("FOLDER", "whole"))
    killed = rt.setup("killed.yaml", TEXT.replace("FOLDER", "killed"))
    begin = time.monotonic()
    done = rt.run(2, whole, "--resume")
    seconds = time.monotonic() - begin
    rt.check("there is no checkpoint" in done.stdout, f"no note without a checkpoint: {done.stdout}")
    torment(killed, seconds)
    done = rt.run(2, killed, "--resume")
    rt.check("resumed after super-step" in done.stdout, f"no resume at the end: {done.stdout}")
    rt.check(rt.digests("killed", "x") == rt.digests("whole", "x"), "outputs differ from the undisturbed run's")
    rt.check(len(rt.digests("whole", "x")) == 7, f"outputs {rt.digests('whole', 'x')}")
    rt.check(rt.ledger("killed", "x")[1] == rt.ledger("whole", "x")[1], "the ledger differs")
    left = [f for f in os.listdir(rt.path("killed")) if f.endswith(".part")]
    rt.check(left == [], f"left behind: {left}")
    other = rt.setup("other.yaml", TEXT.replace("FOLDER", "whole") + "# changed\n")
    refused(other, "belongs to another setup", "another setup")
    damage(whole)
    rt.finish("resume")


main()
