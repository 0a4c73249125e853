"""What a tall workbook costs, in time and memory, and where it goes. Run: pytest -s tests/benchmarks/test_scale.py

Each fill is a process of its own on one core, as the command line is. Timings depend on the machine;
no test here fails for being slow, but one does for memory or for growing faster than the rows.
"""

from __future__ import annotations

import json
import os
import resource
import subprocess
import sys
from pathlib import Path

import pytest
from scale import BEAM_CELLS, ORDINARY_CELLS, schedule

ROWS = (1_000, 10_000, 100_000)
LARGEST = 2 * 1024**3
"""Bytes of memory that the tallest may take."""
WORSE_THAN_LINEAR = 1.5
PARTS = ("start", "beam functions", "engine", "stored values", "file", "rest")

SHARES = """
import gc, json, sys, time
began = time.process_time()
from collections import defaultdict
from functools import wraps
from beamfuncs import cli, functions
from beamfuncs.hosts.headless import engine, filling, package

spent, open_since = defaultdict(float), [["start", began]]

def switch(name):
    now = time.process_time()
    spent[open_since[-1][0]] += now - open_since[-1][1]
    if name:
        open_since.append([name, now])
    else:
        open_since.pop()
        open_since[-1][1] = now

def timed(name, function):
    @wraps(function)
    def call(*arguments, **named):
        switch(name)
        try:
            return function(*arguments, **named)
        finally:
            switch(None)
    return call

def time_all(owner, name, *attributes):
    for one in attributes:
        setattr(owner, one, timed(name, getattr(owner, one)))

time_all(package.Package, "file", "write")
package.Package.read = staticmethod(timed("file", package.Package.read))
time_all(filling, "file", "read", "for_engine", "packed", "filled")
time_all(engine.Engine, "engine", "__init__", "evaluate", "value", "extent")
time_all(filling.Filling, "stored values", "settle")
ours = {name: timed("beam functions", function) for name, function in filling.catalogued().items()}
gc.set_threshold(*cli.COLLECTED)
switch("rest")
filling.fill(sys.argv[1], sys.argv[2], ours)
switch(None)
print(json.dumps(spent))
"""
"""A fill in which every moment is put to the account of one part; measuring slows it a little."""


def one_core() -> None:
    os.sched_setaffinity(0, {min(os.sched_getaffinity(0))})


def run(*words: str | Path) -> tuple[float, int, str]:
    """Processor seconds, largest memory in bytes, and what is printed, of a Python process on one core."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    watched = "import resource, sys; print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss, file=sys.stderr)"
    code = f"import atexit; atexit.register(lambda: exec({watched!r}))\n{words[0]}"
    done = subprocess.run(
        [sys.executable, "-c", code, *map(str, words[1:])],
        capture_output=True,
        text=True,
        check=True,
        preexec_fn=one_core,
    )
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    seconds = after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime
    return seconds, int(done.stderr.split()[-1]) * 1024, done.stdout


FILL = "import sys; from beamfuncs.cli import main; main()"


@pytest.mark.skipif(not hasattr(os, "sched_setaffinity"), reason="NOT RUN: a process cannot be kept to one core here")
def test_scale(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Time grows with the rows and no faster, memory stays under 2 GB; the table says where the time goes."""
    titles = ("rows", "whole", "memory", *PARTS)
    lines = [
        "Processor time on one core; the parts are measured in a second run.",
        "".join(map("{:>16}".format, titles)),
    ]
    seconds = {}
    for rows in ROWS:
        book = schedule(tmp_path / f"{rows}.xlsx", rows)
        seconds[rows], memory, told = run(FILL, "fill", book, "--json")
        report = json.loads(told)
        assert (report["beam_cells"], report["recomputed"]) == (rows * BEAM_CELLS, rows * ORDINARY_CELLS)
        assert report["errors"] == []
        assert memory < LARGEST
        spent = json.loads(run(SHARES, book, tmp_path / "out.xlsx")[2])
        times = (f"{one:.2f} s" for one in (seconds[rows], *(spent[part] for part in PARTS)))
        whole, *shares = times
        lines.append("".join(map("{:>16}".format, (rows, whole, f"{memory / 2**20:.0f} MB", *shares))))
    with capsys.disabled():
        print("\n" + "\n".join(lines))
    assert seconds[100_000] < WORSE_THAN_LINEAR * 10 * seconds[10_000]
