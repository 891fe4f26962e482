"""What a benchmark prints: ratio, target, machine and load."""

from __future__ import annotations

import os
import platform


def report(what: str, ours_s: float, reference_s: float, target: float) -> int:
    """Print the ratio of two times and return the exit status: 0 at or above the target, 1 below."""
    ratio = reference_s / ours_s
    load = os.getloadavg()[0] if hasattr(os, "getloadavg") else float("nan")
    print(f"{what}: {ratio:.1f} times the reference's speed (target {target:g})")
    print(f"  ours {ours_s * 1e3:.2f} ms, reference {reference_s * 1e3:.1f} ms")
    print(
        f"  {platform.machine()}, {os.cpu_count()} cores, Python {platform.python_version()}, load {load:.2f}"
    )
    return 0 if ratio >= target else 1
