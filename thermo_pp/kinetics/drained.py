"""A network that drains from the reactant into its products, every intermediate eliminated."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from thermo_pp.kinetics.edges import EdgeMatrix
from thermo_pp.kinetics.elimination import Reduction
from thermo_pp.kinetics.network import Network


@dataclass(frozen=True, eq=False)
class Drained:
    """One elimination, from which the rates per free reactant and per pool both follow.

    Attributes
    ----------
    inside : tuple of int
        States that the reactant reaches without passing through products, itself first.
    edges : EdgeMatrix
        Ways among them, and into the products.
    reduced : Reduction
        With the reactant left, and a tape.
    """

    inside: tuple[int, ...]
    edges: EdgeMatrix
    reduced: Reduction

    @classmethod
    def of(cls, network: Network, reactant: int, products: Sequence[int]) -> Drained:
        """Eliminate all states but the reactant; products absorb."""
        inside = network.members(reactant, products)
        edges = EdgeMatrix(network, inside, products)
        reduced = Reduction(edges.ways, edges.ends, np.ones(len(products)))
        reduced.eliminate_to(1)
        return cls(tuple(inside), edges, reduced)
