"""A survey of 10,000 outputs: memory, the second run against the first, two processes against one.

The outputs are copies of all fixtures that a reader claims, each with other digits in the last place of a few numbers,
in folders of 100; larger fixtures are taken more often, so that the mean size is 200 KB or more. Every survey is the
program itself in a process of its own, ``thermo-pp survey FOLDER --format json``, with a cache folder that is empty at
first. Memory is the largest sum over the program and its processes of what each has (pages that they share are
divided among them: Pss of ``/proc``), looked at twenty times a second. On fewer than two idle cores the ratio of one
and two processes says nothing. Needs Linux, and 2.5 GB of disk at full size.

Run from the repository: ``PYTHONPATH=. python tests/benchmarks/bench_collect.py [--count 10000]``.
"""

from __future__ import annotations

import argparse
import json
import os
import re
import shutil
import subprocess
import sys
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from machine import report

from thermo_pp.readers import claims
from thermo_pp.sources import HEAD_BYTES

FIXTURES = Path(__file__).resolve().parents[2] / "fixtures"
MEAN_BYTES = 200_000
MOST_MIB = 400.0
SECOND = 1.0 / 0.15
TWO = 1.8
CHANGED = 12
BESIDE = (".toml", ".match", ".why")
_LAST_DIGIT = re.compile(rb"\d\.\d{5,}(?=[\s,\]])")


@dataclass(frozen=True)
class Run:
    """One survey: wall time in s, peak memory in MiB, how many files were read."""

    seconds: float
    peak_mib: float
    read: int


def outputs() -> list[Path]:
    """Return the fixtures that a reader claims."""
    files = (path for path in sorted(FIXTURES.rglob("*")) if path.is_file())
    return [
        path
        for path in files
        if path.suffix not in BESIDE and claims(path.read_bytes()[:HEAD_BYTES])
    ]


def make(folder: Path, count: int) -> float:
    """Write `count` copies below `folder`; return their mean size in bytes."""
    rng = np.random.default_rng(20250102)
    paths = outputs()
    contents = {path: path.read_bytes() for path in paths}
    places = {
        path: [found.end() - 1 for found in _LAST_DIGIT.finditer(data)]
        for path, data in contents.items()
    }
    size = np.array([float(len(contents[path])) for path in paths])
    power = next(
        power
        for power in np.arange(0.0, 3.0, 0.05)
        if np.sum(size ** (power + 1)) / np.sum(size**power) >= 1.02 * MEAN_BYTES
    )
    weight = size**power / np.sum(size**power)
    chosen = [*range(len(paths)), *rng.choice(len(paths), size=count, p=weight)][:count]
    total = 0
    for number, choice in enumerate(chosen):
        path = paths[choice]
        data = bytearray(contents[path])
        for place in rng.choice(places[path] or [0], size=CHANGED):
            if chr(data[place]).isdigit():
                data[place] = ord("0") + int(rng.integers(10))
        target = folder / f"{number // 100:03d}" / f"{number:05d}-{path.name}"
        target.parent.mkdir(exist_ok=True)
        target.write_bytes(data)
        total += len(data)
    return total / count


def survey(folder: Path, *options: str, cache: Path) -> Run:
    """Run the program on a folder."""
    answer = cache / "answer.json"
    command = [sys.executable, "-m", "thermo_pp", "survey", str(folder), "--format", "json"]
    command += ["-o", str(answer), "--quiet", *options]
    start = time.perf_counter()
    process = subprocess.Popen(command, env={**os.environ, "XDG_CACHE_HOME": str(cache)})
    peak = 0.0
    while process.poll() is None:
        peak = max(peak, sum(pss_mib(each) for each in family(process.pid)))
        time.sleep(0.05)
    seconds = time.perf_counter() - start
    if process.returncode:
        raise SystemExit(f"survey ended with status {process.returncode}")
    files = json.loads(answer.read_text())["files"]
    return Run(seconds, peak, sum(file["program"] is not None for file in files))


def family(pid: int) -> list[int]:
    """Return a process and its children's children."""
    found = [pid]
    for parent in found:
        try:
            children = Path(f"/proc/{parent}/task/{parent}/children").read_text()
        except OSError:
            continue
        found += map(int, children.split())
    return found


def pss_mib(pid: int) -> float:
    """Return the memory of a process, shared pages divided among those that share them."""
    try:
        text = Path(f"/proc/{pid}/smaps_rollup").read_text()
    except OSError:
        return 0.0
    found = re.search(r"^Pss: +(\d+) kB", text, re.MULTILINE)
    return int(found.group(1)) / 1024 if found else 0.0


def main() -> int:
    """Print ratios and memory; 1 where one misses its target."""
    parser = argparse.ArgumentParser()
    parser.add_argument("--count", type=int, default=10_000)
    count = parser.parse_args().count
    work = Path(tempfile.mkdtemp(prefix="thermo_pp-bench-"))
    try:
        folder = work / "outputs"
        folder.mkdir()
        mean = make(folder, count)
        print(f"{count} outputs, mean size {mean / 1e3:.0f} KB")
        one = survey(folder, "--jobs", "1", "--no-cache", cache=work)
        two = survey(folder, "--jobs", "2", "--no-cache", cache=work)
        first = survey(folder, cache=work)
        second = survey(folder, cache=work)
    finally:
        shutil.rmtree(work)
    status = int(mean < MEAN_BYTES)
    status |= report("two processes against one", two.seconds, one.seconds, TWO)
    status |= report("second survey against the first", second.seconds, first.seconds, SECOND)
    print(f"  {100.0 * second.seconds / first.seconds:.1f} % of the first one's time (target 15 %)")
    for name, run in (("one process", one), ("two", two), ("first", first), ("second", second)):
        print(
            f"peak memory, {name}: {run.peak_mib:.0f} MiB (target below {MOST_MIB:g}), {run.read} read"
        )
        status |= run.peak_mib >= MOST_MIB
    return int(status or len({run.read for run in (one, two, first, second)}) != 1)


if __name__ == "__main__":
    sys.exit(main())
