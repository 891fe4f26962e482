"""Masses as xtb has them: averages over the natural isotopes, and those that its input changed.

The table was read off xtb 6.5.1 itself, which prints the molecular mass to seven decimals: one run
of a single atom for every element up to radon. They are not the IUPAC values (H 1.00794, not
1.008).
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.readers.text import Text

FloatArray = NDArray[np.float64]

# fmt: off
MASSES_U: tuple[float, ...] = (
    0.0,
    1.0079407, 4.0026019, 6.9400366, 9.0121831, 10.8110280, 12.0107359, 14.0067032, 15.9994049,
    18.9984032, 20.1800464, 22.9897693, 24.3050516, 26.9815385, 28.0854987, 30.9737620, 32.0647874,
    35.4529376, 39.9477986, 39.0983009, 40.0780225, 44.9559083, 47.8667450, 50.9414650, 51.9961318,
    54.9380439, 55.8451444, 58.9331943, 58.6933471, 63.5460400, 65.3777825, 69.7230661, 72.6275502,
    74.9215946, 78.9593886, 79.9035278, 83.7980000, 85.4676636, 87.6166445, 88.9058403, 91.2236416,
    92.9063730, 95.9597885, 97.9072124, 101.0649401, 102.9054980, 106.4153275, 107.8681496,
    112.4115578, 114.8180866, 118.7101126, 121.7597837, 127.6031265, 126.9044719, 131.2927615,
    132.9054520, 137.3268916, 138.9054689, 140.1157307, 140.9076576, 144.2415960, 144.9127559,
    150.3663557, 151.9643781, 157.2521306, 158.9253547, 162.4994728, 164.9303288, 167.2590827,
    168.9342179, 173.0541502, 174.9668150, 178.4849787, 180.9478756, 183.8417775, 186.2067046,
    190.2248596, 192.2160516, 195.0844569, 196.9665688, 200.5991670, 204.3834128, 207.2169081,
    208.9803991, 208.9824308, 209.9871479, 222.0175782,
)
# fmt: on
"""Average mass by atomic number, u, as xtb 6.5.1 prints it."""

_CHANGED = re.compile(
    rb"^\s*mass of (?:elements? '\s*(\w+)\s*'|atom\s+(\d+)|elements with Z=(\d+))\s+changed to"
    rb"\s+(\d+\.\d+)",
    re.MULTILINE,
)
_ANY_CHANGE = re.compile(rb"^\s*mass of .*changed", re.MULTILINE)
_TOTAL = b"      molecular mass/u    :"
_DIGITS = 2e-6
"""What the printed molecular mass may be off, for each atom."""


def masses(text: Text, numbers: NDArray[np.int64]) -> tuple[FloatArray, int | None]:
    """Return the masses of the atoms, and where the file says that they were changed.

    Raises
    ------
    ReadError
        An element without a mass here, a change that is not understood, a molecular mass that is
        not the sum.
    """
    heavy = [z for z in numbers if z >= len(MASSES_U)]
    if heavy:
        raise text.error(
            0,
            f"the mass that xtb takes for {SYMBOLS[heavy[0]]} is not known here",
            mend="give a molecule of elements up to radon",
        )
    found = np.array([MASSES_U[z] for z in numbers])
    at = None
    for change in _CHANGED.finditer(text.data, text.start, text.end):
        at, mass = change.start(4), float(change.group(4))
        if change.group(1) is not None:
            symbol = change.group(1).decode().capitalize()
            found[[SYMBOLS[z] == symbol for z in numbers]] = mass
        elif change.group(3) is not None:
            found[numbers == int(change.group(3))] = mass
        elif 1 <= int(change.group(2)) <= len(found):
            found[int(change.group(2)) - 1] = mass
        else:
            raise text.expected(change.start(), f"one of {len(found)} atoms")
    for line in _ANY_CHANGE.finditer(text.data, text.start, text.end):
        if _CHANGED.match(text.data, line.start()) is None:
            raise text.expected(line.start(), "which masses were changed")
    printed = text.last(_TOTAL)
    if printed >= 0:
        total = float(text.exact_text(printed + len(_TOTAL), "the molecular mass"))
        if abs(total - float(found.sum())) > _DIGITS * len(found):
            raise text.error(
                printed,
                f"the molecular mass is {total}, but the masses taken here add up to {found.sum():.7f}",
                mend="give an output of a molecule whose masses are xtb's own, or changed in $hess",
            )
    return found, at
