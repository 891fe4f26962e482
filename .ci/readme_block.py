"""Print a fenced block of the README: the n-th `sh` block, or what the first one is shown to print."""

from __future__ import annotations

import re
import sys
from pathlib import Path

_BLOCK = re.compile(r"^```(\w+)\n(.*?)^```$", re.DOTALL | re.MULTILINE)


def main(which: str) -> None:
    """Print the block `which`: a number, or "output"."""
    text = Path(__file__).parent.parent.joinpath("README.md").read_text(encoding="utf-8")
    blocks = _BLOCK.findall(text)
    if which == "output":
        found = [body for language, body in blocks if language == "text"]
        sys.stdout.write(found[0])
        return
    found = [body for language, body in blocks if language == "sh"]
    sys.stdout.write(found[int(which) - 1])


if __name__ == "__main__":
    main(sys.argv[1])
