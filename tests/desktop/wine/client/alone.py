"""The compiled kernel alone, with numpy and nothing else of ours but its binding: alone.py ASKED.npz TOLD.npz

ASKED: by job number, the network as two flat arrays and the arrays of its cases; `tubes` names the jobs that
are tubes. TOLD: what came back. Runs in Windows Python; the tests call `play` on Linux for the same jobs.
"""

import ctypes
import sys

import numpy as np

from moletally.kernel.compiled.library import FILE, Tanks, Tubes, library

IN = {"feed", "tau", "T", "p", "start", "fed", "scale", "asked"}


def play(asked):
    """Answers by job number and name; asked: arrays by the same."""
    jobs, told = {}, {"library": np.array(str(FILE))}
    for key in asked:
        if "/" in key:
            job, name = key.split("/")
            jobs.setdefault(int(job), {})[name] = np.asarray(asked[key], order="C")
    for number, job in jobs.items():
        for name, array in solve(job).items():
            told[f"{number}/{name}"] = array
    return told


def solve(job):
    """The answers of one job by name."""
    n, species = job["feed"].shape
    ints, reals = job["ints"], job["reals"]
    if "asked" in job:
        out = {"c": (n, job["asked"].shape[1], species), "status": job["asked"].shape, "exhausted_at": (n, species),
               "steps": (n,), "work": (n,)}  # fmt: skip
        record, function = Tubes(n=n, m=job["asked"].shape[1]), library().mt_solve_tubes
    else:
        out = {"c": (n, species), "root": (n, species), "exhausted": (n, species),
               **dict.fromkeys(("status", "from_start", "faded", "residual", "condition", "error", "iterations", "work"),
                               (n,))}  # fmt: skip
        record, function = Tanks(n=n, how=int(job["how"])), library().mt_solve_tanks
    types = {"status": np.int32, "steps": np.int32, "work": np.int32, "iterations": np.int32,
             "from_start": np.uint8, "faded": np.uint8, "exhausted": np.uint8}  # fmt: skip
    answers = {name: np.zeros(shape, dtype=types.get(name, np.float64)) for name, shape in out.items()}
    if "c" in job:
        answers["c"][:] = job["c"]
    for name, array in (*answers.items(), *((name, job[name]) for name in IN & set(job))):
        setattr(record, name, array.ctypes.data)
    network = library().mt_network_new(
        ints.ctypes.data_as(ctypes.POINTER(ctypes.c_int32)), len(ints),
        reals.ctypes.data_as(ctypes.POINTER(ctypes.c_double)), len(reals),
    )  # fmt: skip
    assert network
    try:
        assert function(network, ctypes.byref(record)) >= 0
    finally:
        library().mt_network_free(network)
    return answers


if __name__ == "__main__":
    with np.load(sys.argv[1]) as jobs:
        np.savez(sys.argv[2], **play({name: jobs[name] for name in jobs.files}))
