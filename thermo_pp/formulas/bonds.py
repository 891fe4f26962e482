"""Bonds: which atoms are bonded, and fragments that can be compared between structures.

Two atoms are bonded where their distance is below a factor times the sum of their covalent radii.
No one factor is right for saddle points and weak complexes, so a structure has a family of bond
graphs, one for every factor in a window, and each costs what its factor is off the usual one.
"""

from __future__ import annotations

from collections.abc import Sequence
from hashlib import blake2b
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.data.radii import COVALENT_ANGSTROM, FARTHEST_ANGSTROM

IntArray = NDArray[np.int64]
FloatArray = NDArray[np.float64]

USUAL_FACTOR = 1.25
"""Longest bond in units of the sum of covalent radii; weak complexes begin above."""
FACTORS = (1.05, 1.45)
"""Window of the factors of a family."""
LABEL = 1000
"""A kind of atom is its atomic number plus this times a label of its own (an isotope)."""


class Fragment(NamedTuple):
    """Atoms that hang together: two are equal where their bond graphs are.

    Attributes
    ----------
    kinds : tuple of int
        Kinds of atoms, ascending.
    digest : str
        Of the graph, whatever the order of the atoms.
    """

    kinds: tuple[int, ...]
    digest: str

    @property
    def numbers(self) -> tuple[int, ...]:
        """Atomic numbers, ascending."""
        return tuple(sorted(kind % LABEL for kind in self.kinds))


Fragments = tuple[Fragment, ...]
"""All fragments of a structure or of several, sorted: equal where the bonds are the same."""


def close_pairs(
    kinds: ArrayLike, positions_angstrom: ArrayLike, factor: float = FACTORS[1]
) -> tuple[IntArray, FloatArray]:
    """Return the pairs of atoms closer than `factor` times the sum of their radii.

    Parameters
    ----------
    kinds : shape (n,)
        Atomic numbers, labels allowed.
    positions_angstrom : shape (n, 3)
    factor : float

    Returns
    -------
    pairs : shape (p, 2), int
        The relatively shortest first.
    lengths : shape (p,)
        Distance over sum of radii.
    """
    z = np.asarray(kinds, dtype=np.int64) % LABEL
    x = np.asarray(positions_angstrom, dtype=np.float64)
    table = np.array(COVALENT_ANGSTROM)
    radii = np.where(z < len(table), table[np.minimum(z, len(table) - 1)], FARTHEST_ANGSTROM)
    first, second = np.triu_indices(len(z), k=1)
    lengths = np.linalg.norm(x[first] - x[second], axis=-1) / (radii[first] + radii[second])
    order = np.argsort(lengths, kind="stable")
    order = order[lengths[order] < factor]
    return np.stack([first, second], axis=1)[order], lengths[order]


def fragments(kinds: ArrayLike, pairs: ArrayLike) -> Fragments:
    """Return the fragments that bonds between `pairs` of atoms make.

    Two graphs with equal answers are taken to be the same: the answer holds, refined over the
    neighbours until it tells no more atoms apart, the kind of each atom and the kinds of all others
    by their distance in bonds.

    Parameters
    ----------
    kinds : shape (n,)
    pairs : shape (p, 2), int
    """
    from scipy.sparse import csr_array
    from scipy.sparse.csgraph import shortest_path

    all_kinds = np.asarray(kinds, dtype=np.int64).tolist()
    n = len(all_kinds)
    bonds = np.asarray(pairs, dtype=np.int64).reshape(-1, 2)
    graph = csr_array((np.ones(len(bonds)), (bonds[:, 0], bonds[:, 1])), shape=(n, n))
    apart = shortest_path(graph, directed=False, unweighted=True)
    near: list[list[int]] = [[] for _ in range(n)]
    for one, other in bonds.tolist():
        near[one].append(other)
        near[other].append(one)
    found, left = [], set(range(n))
    while left:
        inside = np.flatnonzero(np.isfinite(apart[min(left)])).tolist()
        left.difference_update(inside)
        found.append(_fragment(inside, all_kinds, apart, near))
    return tuple(sorted(found))


def _fragment(
    inside: Sequence[int],
    kinds: Sequence[int],
    apart: FloatArray,
    near: Sequence[Sequence[int]],
) -> Fragment:
    colours = {
        atom: _digest((kinds[atom], sorted((int(apart[atom, k]), kinds[k]) for k in inside)))
        for atom in inside
    }
    while True:
        finer = {
            atom: _digest((colours[atom], sorted(colours[k] for k in near[atom])))
            for atom in inside
        }
        done = len(set(finer.values())) == len(set(colours.values()))
        colours = finer
        if done:
            break
    return Fragment(
        tuple(sorted(kinds[atom] for atom in inside)), _digest(sorted(colours.values()))
    )


def _digest(value: object) -> str:
    return blake2b(repr(value).encode(), digest_size=8).hexdigest()


def usual_fragments(kinds: ArrayLike, positions_angstrom: ArrayLike) -> Fragments:
    """Return the fragments with bonds up to the usual factor."""
    return fragments(kinds, close_pairs(kinds, positions_angstrom, USUAL_FACTOR)[0])


class Reach(NamedTuple):
    """For which factors a structure has certain fragments.

    Attributes
    ----------
    off : float
        The least |factor - USUAL_FACTOR| of them.
    width : float
        How wide the range of these factors is.
    """

    off: float
    width: float


def family(
    kinds: ArrayLike,
    positions_angstrom: ArrayLike,
    known: dict[bytes, Fragments] | None = None,
) -> dict[Fragments, Reach]:
    """Return the fragments for every factor of the window.

    Parameters
    ----------
    kinds : shape (n,)
    positions_angstrom : shape (n, 3)
    known : dict or None
        Bonds -> fragments, of the same atoms; filled, so that bonds that come again cost nothing.

    Returns
    -------
    dict of Fragments to Reach
        Widths sum to that of the window.
    """
    known = {} if known is None else known
    pairs, lengths = close_pairs(kinds, positions_angstrom)
    edges = np.concatenate([[FACTORS[0]], lengths[lengths > FACTORS[0]], [FACTORS[1]]])
    found: dict[Fragments, Reach] = {}
    for low, high in zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True):
        bonded = pairs[lengths <= low]
        key = bonded[np.lexsort(bonded.T)].tobytes()
        if key not in known:
            known[key] = fragments(kinds, bonded)
        off = max(low - USUAL_FACTOR, USUAL_FACTOR - high, 0.0)
        before = found.get(known[key], Reach(off, 0.0))
        found[known[key]] = Reach(min(off, before.off), before.width + high - low)
    return found
