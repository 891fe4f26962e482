"""A survey of 10,000 outputs: memory, the second run against the first, two processes against one.

The outputs are copies of all fixtures that a reader claims, each with other digits in the last place of a few numbers,
in folders of 100; larger fixtures are taken more often, so that the mean size is 200 KB or more. Every survey is the
program itself in a process of its own, ``thermo-pp survey FOLDER --format json``.

One process and two take turns for some rounds, and the least time of each counts. In the same rounds the machine's own
ceiling is measured: two surveys by one process each, of one half of the folders, first one after the other, then both
at the same time; programs that have nothing to do with each other do not reach more than that ratio. On fewer than
two idle cores none of the ratios says anything; the processor times beside them still do.

Memory is looked at in runs of their own, as looking takes time: the largest sum over the program and its processes of
what each has (pages that they share are divided among them: Pss of ``/proc``), twenty times a second. The first and
the second survey with a cache, empty at first, are two of these. Needs Linux, and 2.5 GB of disk at full size.

Run from the repository: ``PYTHONPATH=. python tests/benchmarks/bench_collect.py [--count 10000] [--rounds 3]``.
"""

from __future__ import annotations

import argparse
import json
import os
import re
import shutil
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
    """One survey: wall and processor time in s, peak memory in MiB (0: not looked at), how many files were read."""

    seconds: float
    processor_s: float
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


class Survey:
    """The program at work on some folders, in a process of its own."""

    def __init__(self, folders: list[Path], *options: str, cache: Path) -> None:
        self._answer = cache / f"{folders[0].name}.json"
        command = [sys.executable, "-m", "thermo_pp", "survey", *map(str, folders)]
        command += ["--format", "json", "-o", str(self._answer), "--quiet", *options]
        self._start = time.perf_counter()
        self._pid = os.posix_spawn(
            command[0], command, {**os.environ, "XDG_CACHE_HOME": str(cache)}
        )

    def watched(self) -> float:
        """Return the peak memory in MiB, when the program is about to end."""
        peak = 0.0
        while os.waitid(os.P_PID, self._pid, os.WEXITED | os.WNOHANG | os.WNOWAIT) is None:
            peak = max(peak, sum(pss_mib(each) for each in family(self._pid)))
            time.sleep(0.05)
        return peak

    def ended(self, peak_mib: float = 0.0) -> Run:
        """Wait for the end and return what it took."""
        _, status, usage = os.wait4(self._pid, 0)
        seconds = time.perf_counter() - self._start
        if status:
            raise SystemExit(f"survey ended with status {os.waitstatus_to_exitcode(status)}")
        files = json.loads(self._answer.read_text())["files"]
        read = sum(file["program"] is not None for file in files)
        return Run(seconds, usage.ru_utime + usage.ru_stime, peak_mib, read)


def survey(folder: Path, *options: str, cache: Path, watch: bool = False) -> Run:
    """Run the program on a folder."""
    running = Survey([folder], *options, cache=cache)
    return running.ended(running.watched() if watch else 0.0)


def ceiling(folder: Path, cache: Path) -> tuple[float, float]:
    """Return the time of two halves of a folder one after the other and at the same time, s."""
    folders = sorted(folder.iterdir())
    halves = folders[::2], folders[1::2]

    def start(half: list[Path]) -> Survey:
        return Survey(half, "--jobs", "1", "--no-cache", cache=cache)

    if not halves[1]:
        raise SystemExit("one folder has no halves: --count must be above 100")
    in_turn = sum(start(half).ended().seconds for half in halves)
    both = [start(half) for half in halves]
    return in_turn, max(each.ended().seconds for each in both)


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
    parser.add_argument("--rounds", type=int, default=3)
    asked = parser.parse_args()
    work = Path(tempfile.mkdtemp(prefix="thermo_pp-bench-"))
    try:
        folder = work / "outputs"
        folder.mkdir()
        mean = make(folder, asked.count)
        print(f"{asked.count} outputs, mean size {mean / 1e3:.0f} KB")
        ones, twos, halves = [], [], []
        for _ in range(asked.rounds):
            ones.append(survey(folder, "--jobs", "1", "--no-cache", cache=work))
            twos.append(survey(folder, "--jobs", "2", "--no-cache", cache=work))
            halves.append(ceiling(folder, work))
            print_round(ones[-1], twos[-1], halves[-1])
        watched = {
            "one process": survey(folder, "--jobs", "1", "--no-cache", cache=work, watch=True),
            "two": survey(folder, "--jobs", "2", "--no-cache", cache=work, watch=True),
            "first": survey(folder, cache=work, watch=True),
            "second": survey(folder, cache=work, watch=True),
        }
    finally:
        shutil.rmtree(work)
    one, two = (min(run.seconds for run in runs) for runs in (ones, twos))
    in_turn, at_once = (min(column) for column in zip(*halves, strict=True))
    status = int(mean < MEAN_BYTES)
    status |= report("two processes against one", two, one, TWO)
    print(f"  two programs on one half each: {in_turn / at_once:.2f}, the machine's own ceiling")
    one, two = (min(run.processor_s for run in runs) for runs in (ones, twos))
    print(
        f"  processor time: one process {one:.1f} s, two {two:.1f} s, {two / one:.2f} times as much"
    )
    first, second = watched["first"].seconds, watched["second"].seconds
    status |= report("second survey against the first", second, first, SECOND)
    print(f"  {100.0 * second / first:.1f} % of the first one's time (target 15 %)")
    for name, run in watched.items():
        print(
            f"peak memory, {name}: {run.peak_mib:.0f} MiB (target below {MOST_MIB:g}), {run.read} read"
        )
        status |= run.peak_mib >= MOST_MIB
    return int(status or len({run.read for run in (*ones, *twos, *watched.values())}) != 1)


def print_round(one: Run, two: Run, halves: tuple[float, float]) -> None:
    """Print what one round took."""
    print(
        f"  one {one.seconds:.1f} s ({one.processor_s:.1f} of processors),"
        f" two {two.seconds:.1f} s ({two.processor_s:.1f}), ratio {one.seconds / two.seconds:.2f};"
        f" ceiling {halves[0] / halves[1]:.2f}; load {os.getloadavg()[0]:.1f}",
        flush=True,
    )


if __name__ == "__main__":
    sys.exit(main())
