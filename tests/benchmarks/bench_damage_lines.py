"""Every line of the fixtures lost, doubled and with a byte flipped: each copy ends as `damage` says.

Recorded, not timed; exits 1 where one does not. Of a file with more lines, MOST are drawn (120 unless given).
``python tests/benchmarks/bench_damage_lines.py [MOST] [SEED] [READER ...]``
"""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

from damage import failure, fixtures, line_by_line

from thermo_pp.readers import read_source
from thermo_pp.sources import open_source


def main(most: int = 120, seed: int = 1, *readers: str) -> int:
    """Read damaged copies and print what went wrong."""
    paths = [path for path in fixtures() if not readers or path.parent.parent.name in readers]
    rng = np.random.default_rng(seed)
    count = wrong = 0
    for path in paths:
        original = read_source(open_source(path))
        for variant in line_by_line(path, rng, most):
            count += 1
            found = failure(variant, original)
            if found is not None:
                wrong += 1
                print(f"{variant.name}: {found}"[:300], flush=True)
    print(f"{count} variants of {len(paths)} fixtures, {wrong} wrong")
    return 1 if wrong else 0


if __name__ == "__main__":
    words = sys.argv[1:]
    sys.exit(main(*(int(word) for word in words[:2]), *words[2:]))
