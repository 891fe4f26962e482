"""Ends: which minima a saddle point joins, by following its imaginary mode both ways.

The saddle point is displaced along plus and minus its imaginary mode by growing amounts. Wherever
the bonds of the displaced structure, counted with some factor of the family of `formulas.bonds`,
are those of a set of minima, that set matches, and the match costs what the displacement and the
factors are away from none and from the usual one. A set belongs to the side that it matches over the
wider range of displacements and factors. No energies are used: this is a guess to be looked at.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from thermo_pp.formulas.bonds import USUAL_FACTOR, Fragments, Reach, close_pairs, family
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.formulas.superposition import match
from thermo_pp.grouping import Grouped, atom_kinds, balances
from thermo_pp.readers import read
from thermo_pp.records import Calculation

FloatArray = NDArray[np.float64]

STEPS_ANGSTROM = (0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8)
"""How far the atom that moves most is displaced."""
COST_PER_ANGSTROM = 0.3
"""Cost of a displacement; that of a factor is its distance from the usual one."""
AS_GOOD = 0.1
"""Of sets whose costs differ by less, the one with fewer molecules comes first."""
NO_LEAN = 0.1
"""A set whose ranges on the two sides differ by a smaller share belongs to both."""
LOOKED_AT_ANGSTROM = 0.4
"""Displacement at which bonds are described and shapes are compared."""
LEAST_LEAN = 0.01
"""Least relative difference of the two distances of a structure that leans to one side."""
MOST_ATOMS = 60
"""Shapes of larger structures are not compared."""

Names = tuple[str, ...]


@dataclass(frozen=True)
class Ends:
    """What a saddle point may join.

    Attributes
    ----------
    followed : bool
        Whether there was a mode to follow.
    sides : two tuples of tuples of str
        For either way, the sets of minima that match, the best first.
    others : tuple of tuple of str
        Sets that balance and match neither way, small ones first.
    changes : tuple of str
        Bonds that are there one way and not the other, in words, for each way; empty where no mode
        was followed.
    """

    followed: bool
    sides: tuple[tuple[Names, ...], tuple[Names, ...]]
    others: tuple[Names, ...]
    changes: tuple[str, str] = ("", "")


def ends(saddle: Grouped, minima: Mapping[str, Grouped]) -> Ends:
    """Return the sets of minima that a saddle point may join.

    Parameters
    ----------
    saddle : Grouped
    minima : mapping of str to Grouped
        Of each molecule one conformer.
    """
    sets = balances(saddle, minima)
    ways = displaced(saddle.frequencies)
    if ways is None:
        return Ends(False, ((), ()), sets)
    kinds = atom_kinds(saddle.frequencies)
    known: dict[bytes, Fragments] = {}
    reached = [_reached(kinds, way, known) for way in ways]
    families = {name: _family(minima[name]) for name in {n for names in sets for n in names}}
    matches = {names: [_matched(names, families, side) for side in reached] for names in sets}
    sides: list[tuple[Names, ...]] = []
    for own in (0, 1):
        mine = {names: each[own].off for names, each in matches.items() if _belongs(each, own)}
        sides.append(_ranked(mine))
    others = tuple(names for names in sets if not any(names in side for side in sides))
    at = STEPS_ANGSTROM.index(LOOKED_AT_ANGSTROM)
    return Ends(
        True, (sides[0], sides[1]), others, _changes(saddle.frequencies, ways[0][at], ways[1][at])
    )


def displaced(calc: Calculation) -> tuple[FloatArray, FloatArray] | None:
    """Return the structure displaced along plus and minus its imaginary mode.

    Returns
    -------
    two arrays of shape (steps, n, 3), or None
        A; None where neither the mode nor the Hessian is there.
    """
    if calc.modes is None and calc.hessian_hartree_bohr2 is None:
        calc = read(calc.path)  # a collection does not hold everything
    modes = calc.modes
    if modes is None and calc.hessian_hartree_bohr2 is not None:
        modes = normal_modes(
            calc.hessian_hartree_bohr2, calc.masses_u, calc.positions_angstrom
        ).modes
    if modes is None or not len(modes):
        return None
    longest = np.linalg.norm(modes[0], axis=-1).max()
    if not longest > 0.0:
        return None
    shifts = np.array(STEPS_ANGSTROM)[:, np.newaxis, np.newaxis] * modes[0] / longest
    return calc.positions_angstrom + shifts, calc.positions_angstrom - shifts


def nearest(saddle: Calculation, members: Sequence[Calculation]) -> tuple[int | None, int | None]:
    """Return which of several structures lies nearest on either side of a saddle point.

    Only those count that are nearer to that side than to the other; None where none is.
    """
    ways = displaced(saddle)
    if ways is None or len(saddle.numbers) > MOST_ATOMS:
        return None, None
    apart = np.array([_distances(saddle, member, ways) for member in members])
    found: list[int | None] = []
    for own in (0, 1):
        mine, other = apart[:, own], apart[:, 1 - own]
        leaning = np.flatnonzero(mine < other * (1.0 - LEAST_LEAN))
        found.append(int(leaning[np.argmin(mine[leaning])]) if len(leaning) else None)
    return found[0], found[1]


def _family(structure: Grouped) -> dict[Fragments, Reach]:
    calc = structure.frequencies
    return family(atom_kinds(calc), calc.positions_angstrom)


def _reached(
    kinds: NDArray[np.int64], way: FloatArray, known: dict[bytes, Fragments]
) -> dict[Fragments, Reach]:
    """Return the fragments that come up on one way: least cost, and the range summed over the way."""
    found: dict[Fragments, Reach] = {}
    for shift, positions in zip(STEPS_ANGSTROM, way, strict=True):
        for made, reach in family(kinds, positions, known).items():
            cost = shift * COST_PER_ANGSTROM + reach.off
            before = found.get(made, Reach(cost, 0.0))
            found[made] = Reach(min(cost, before.off), before.width + reach.width)
    return found


def _matched(
    names: Names,
    families: Mapping[str, Mapping[Fragments, Reach]],
    reached: Mapping[Fragments, Reach],
) -> Reach:
    """Return the least cost at which a set of minima matches, infinite where it never does, and its range."""
    unions: dict[Fragments, float] = {(): 0.0}
    for name in names:
        unions = {
            tuple(sorted((*union, *made))): max(cost, reach.off)
            for union, cost in unions.items()
            for made, reach in families[name].items()
        }
    common = [union for union in unions if union in reached]
    return Reach(
        min((unions[union] + reached[union].off for union in common), default=math.inf),
        sum(reached[union].width for union in common),
    )


def _belongs(matches: Sequence[Reach], own: int) -> bool:
    """Tell whether a set belongs to one side: its range is wider there, or as wide."""
    mine, other = matches[own].width, matches[1 - own].width
    return mine > 0.0 and mine >= other - NO_LEAN * max(mine, other)


def _distances(
    saddle: Calculation, member: Calculation, ways: tuple[FloatArray, FloatArray]
) -> list[float]:
    """Return how far a structure, or its mirror image, is from either displaced one, A."""
    at = STEPS_ANGSTROM.index(LOOKED_AT_ANGSTROM)
    a = (atom_kinds(member), member.positions_angstrom)
    kinds = atom_kinds(saddle)
    return [
        min(match(*a, kinds, way[at], mirror=mirror) for mirror in (False, True)) for way in ways
    ]


def _ranked(costs: Mapping[Names, float]) -> tuple[Names, ...]:
    """Return sets by cost; of those as good as the best, the one with fewest molecules first."""
    if not costs:
        return ()
    best = min(costs.values())
    order = list(costs)
    return tuple(
        sorted(
            costs,
            key=lambda names: (
                (0, len(names), costs[names], order.index(names))
                if costs[names] < best + AS_GOOD
                else (1, costs[names], len(names), order.index(names))
            ),
        )
    )


def _changes(calc: Calculation, one: FloatArray, other: FloatArray) -> tuple[str, str]:
    """Say which bonds either way has and the other has not."""
    from thermo_pp.data.elements import SYMBOLS

    bonds = [
        {tuple(pair) for pair in close_pairs(calc.numbers, x, USUAL_FACTOR)[0].tolist()}
        for x in (one, other)
    ]

    def words(pairs: set[tuple[int, ...]]) -> str:
        return ", ".join(
            "-".join(f"{SYMBOLS[int(calc.numbers[k])]}{k + 1}" for k in pair)
            for pair in sorted(pairs)
        )

    return words(bonds[0] - bonds[1]), words(bonds[1] - bonds[0])
