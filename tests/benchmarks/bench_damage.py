"""10,000 damaged copies of all fixtures: each ends in the original values, what the damaged line says, or an error.

Recorded, not timed; exits 1 where one does not. ``python tests/benchmarks/bench_damage.py [COUNT] [SEED]``
"""

from __future__ import annotations

import sys
from collections import Counter
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from damage import failure, fixtures, variants

from thermo_pp.readers import read_source
from thermo_pp.sources import open_source


def main(count: int = 10_000, seed: int = 1) -> int:
    """Read damaged copies and print what went wrong."""
    paths = fixtures()
    originals = {path: read_source(open_source(path)) for path in paths}
    kinds: Counter[str] = Counter()
    wrong = 0
    for variant in variants(np.random.default_rng(seed), paths, count):
        kinds[variant.kind] += 1
        found = failure(variant, originals[variant.fixture])
        if found is not None:
            wrong += 1
            print(f"{variant.name}: {found}"[:300], flush=True)
    print(f"{count} variants of {len(paths)} fixtures, {wrong} wrong; {dict(kinds)}")
    return 1 if wrong else 0


if __name__ == "__main__":
    sys.exit(main(*(int(word) for word in sys.argv[1:])))
