"""Reading outputs of four programs against cclib, and large ones against plain iteration over their lines.

Both read the same files in the same run; ours hashes them and counts line numbers. ORCA and Gaussian outputs are those
of the folder of other programs' outputs beside the repository, left out where it is not there. Files that cclib cannot
read are left out of both. Exits 1 below a target.

Debian's build of Psi4 prints a line that cclib 1.8.1 takes for an impossible version (``Git: Rev {} zzzzzzz``), and so
it reads none of these outputs as they stand. Both read copies with a revision such as other builds print.
"""

from __future__ import annotations

import logging
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

from machine import report

from thermo_pp.readers import read_source
from thermo_pp.sources import Source

ROOT = Path(__file__).resolve().parents[2]
OTHERS = ROOT.parent / "shared" / "data" / "other-programs"
TARGET, LINES_TARGET = 15.0, 0.25
LARGE_BYTES = 1_000_000
FOLDERS = {
    "nwchem": [ROOT / "fixtures/nwchem/good", ROOT / "fixtures/stack-plume/outputs"],
    "psi4": [ROOT / "fixtures/psi4/good", ROOT / "fixtures/stack-plume/outputs"],
    "orca": [OTHERS / "ORCA"],
    "gaussian": [OTHERS / "Gaussian"],
}


def ours(path: Path) -> None:
    """Read, hash and count lines."""
    calculation = read_source(Source(str(path), path.read_bytes()))
    assert len(calculation.sha256) == 64
    assert calculation.where["energy_hartree"] > 0


def theirs(path: Path) -> None:
    """Read with cclib."""
    import cclib

    assert cclib.io.ccread(str(path), loglevel=logging.CRITICAL) is not None


def lines(path: Path) -> None:
    """Iterate over the lines."""
    with path.open("rb") as file:
        for _ in file:
            pass


NO_REVISION, A_REVISION = b"Git: Rev {} zzzzzzz", b"Git: Rev {HEAD} 0123456"


def with_a_revision(paths: list[Path], folder: Path) -> list[Path]:
    """Return copies of outputs of Psi4 that say from which revision it was built."""
    copies = [folder / f"{number}-{path.name}" for number, path in enumerate(paths)]
    for path, copy in zip(paths, copies, strict=True):
        copy.write_bytes(path.read_bytes().replace(NO_REVISION, A_REVISION))
    return copies


def works(action: Callable[[Path], None], path: Path) -> bool:
    """Tell whether the file can be read this way."""
    try:
        action(path)
    except Exception:
        return False
    return True


def fastest(action: Callable[[Path], None], path: Path, rounds: int) -> float:
    """Return the processor time of one action, s: the least of several rounds."""
    times = []
    for _ in range(rounds):
        start = time.process_time()
        action(path)
        times.append(time.process_time() - start)
    return min(times)


def program(path: Path) -> str | None:
    """Return which program wrote the file, as our readers tell; None where none claims it."""
    from thermo_pp.readers import claims

    found = claims(path.read_bytes()[:65536])
    return found[0].NAME if len(found) == 1 else None


def main() -> int:
    """Print the ratios; 1 where one is below its target."""
    with tempfile.TemporaryDirectory(prefix="thermo_pp-bench-") as folder:
        return measured(Path(folder))


def measured(folder: Path) -> int:
    """Print the ratios; copies of outputs go to `folder`."""
    status = 0
    large: list[Path] = []
    for name, folders in FOLDERS.items():
        paths = [p for folder in folders for p in sorted(folder.rglob("*")) if p.is_file()]
        paths = [p for p in paths if p.suffix in (".out", ".log") and program(p) == name]
        large += [p for p in paths if p.stat().st_size > LARGE_BYTES]
        paths = with_a_revision(paths, folder) if name == "psi4" else paths
        paths = [p for p in paths if works(ours, p) and works(theirs, p)]
        if not paths:
            print(f"{name}: no outputs here")
            continue
        mine = sum(fastest(ours, p, 9) for p in paths)
        reference = sum(fastest(theirs, p, 3) for p in paths)
        what = f"reading {len(paths)} {name} outputs against cclib"
        status |= report(what, mine, reference, TARGET)
    mine = sum(fastest(ours, p, 9) for p in large)
    reference = sum(fastest(lines, p, 9) for p in large)
    what = f"reading {len(large)} outputs over 1 MB against iterating over their lines"
    return status | report(what, mine, reference, LINES_TARGET)


if __name__ == "__main__":
    sys.exit(main())
