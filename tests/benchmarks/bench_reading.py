"""Reading the NWChem fixtures against ``ase.io.read`` in the same run.

Ours reads the file from disk and takes all of it (geometry, energy, level, modes, Hessian, printed thermochemistry),
hashes it and counts line numbers; ASE reads the last structure with its energy. Archives and files beside the output,
which ASE does not look for, are not looked for here either. Files that ASE cannot read are left out of both.
The time of a file is the processor time of the best of several rounds, one program after the other; the ratio is that
of the sums. Run from the repository: ``PYTHONPATH=. python tests/benchmarks/bench_reading.py``.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from pathlib import Path

import ase.io
from machine import report

from thermo_pp.readers import nwchem
from thermo_pp.sources import Source

ROOT = Path(__file__).resolve().parents[2] / "fixtures"
TARGET = 15.0
ROUNDS = {"ours": 25, "theirs": 7}
"""The shorter the time, the more rounds it takes to meet one that nothing disturbed."""


def ours(path: Path) -> None:
    """Read, hash and count lines."""
    calculation = nwchem.read(Source(str(path), path.read_bytes()))
    assert len(calculation.sha256) == 64
    assert calculation.where["energy_hartree"] > 0


def theirs(path: Path) -> None:
    """Read the last structure and its energy."""
    ase.io.read(path, format="nwchem-out").get_potential_energy()


def readable(path: Path) -> bool:
    """Tell whether ASE reads the file."""
    try:
        theirs(path)
    except Exception:
        return False
    return True


def fastest(action: Callable[[Path], None], path: Path) -> float:
    """Return the processor time of one action, s: the least of several rounds."""
    times = []
    for _ in range(ROUNDS[action.__name__]):
        start = time.process_time()
        action(path)
        times.append(time.process_time() - start)
    return min(times)


def main() -> int:
    """Print the ratio; 1 where it is below the target."""
    files = [
        path
        for folder in ("nwchem/good", "stack-plume/outputs")
        for path in sorted((ROOT / folder).glob("*.out"))
        if nwchem.sniff(path.read_bytes()[:65536]) and readable(path)
    ]
    best = {path: (fastest(ours, path), fastest(theirs, path)) for path in files}
    ratios = {path: times[1] / times[0] for path, times in best.items()}
    size = sum(path.stat().st_size for path in files) / 1e6
    least = min(files, key=lambda path: ratios[path])
    most = max(files, key=lambda path: ratios[path])
    status = report(
        f"reading {len(files)} NWChem outputs, {size:.1f} MB, against ase.io.read",
        sum(times[0] for times in best.values()),
        sum(times[1] for times in best.values()),
        TARGET,
    )
    print(f"  by file: {ratios[least]:.1f} ({least.name}) to {ratios[most]:.1f} ({most.name})")
    return status


if __name__ == "__main__":
    sys.exit(main())
