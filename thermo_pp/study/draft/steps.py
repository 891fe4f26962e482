"""Steps of a draft: through saddle points, and barrierless ones that build complexes."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from thermo_pp.formulas.bonds import Fragments, family
from thermo_pp.grouping import atom_kinds, balances
from thermo_pp.mechanism import write_sum
from thermo_pp.study.draft.ends import Ends, Names, ends, nearest
from thermo_pp.study.draft.members import Member, Members, hill

MOST_LISTED = 6
"""How many further sets a comment lists."""


@dataclass(frozen=True)
class ProposedStep:
    """A step that a draft proposes.

    Attributes
    ----------
    left, right : tuple of str
        Names, twice where two molecules take part.
    through : str or None
        The saddle point; None: barrierless.
    words : tuple of str
        What is known of it, a sentence each.
    sure : bool
        Both ends follow from the imaginary mode.
    """

    left: Names
    right: Names
    through: str | None
    words: tuple[str, ...] = ()
    sure: bool = True

    @property
    def equation(self) -> str:
        """The equation as a study has it."""
        return f"{written(self.left)} = {written(self.right)}"

    @property
    def species(self) -> tuple[str, ...]:
        """Every species of both sides once, the saddle point left out."""
        return tuple(dict.fromkeys((*self.left, *self.right)))

    def reversed(self) -> ProposedStep:
        """Return the same step written the other way round."""
        return ProposedStep(self.right, self.left, self.through, self.words, self.sure)


@dataclass(frozen=True)
class NoStep:
    """A saddle point for which no step can be proposed.

    Attributes
    ----------
    saddle : str
    words : tuple of str
        Why, a sentence each.
    """

    saddle: str
    words: tuple[str, ...]


def written(names: Sequence[str]) -> str:
    """Write a set of species as one side of an equation."""
    return write_sum(Counter(names))


def saddle_step(name: str, found: Members, lowest: Mapping[str, Member]) -> ProposedStep | NoStep:
    """Propose the step through one saddle point.

    Parameters
    ----------
    name : str
        The saddle point.
    found : Members
    lowest : mapping of str to Member
        Of every molecule one conformer.
    """
    candidates = {each: member.grouped for each, member in lowest.items()}
    ends_ = ends(found.saddles[name].grouped, candidates)
    if not ends_.followed:
        return _by_balance(name, ends_, lowest)
    one, other = (side[0] if side else None for side in ends_.sides)
    if one is not None and one == other:
        return _same_ends(name, one, ends_, found, lowest)
    if one is not None and other is not None:
        words = ["Both ends follow from the imaginary mode.", *_further(ends_, (one, other))]
        return ProposedStep(one, other, name, tuple(words))
    known = one or other
    if known is None:
        return NoStep(name, _nothing_matches(ends_))
    missing = 1 if one is not None else 0
    unlike = [
        names for names in ends_.others if _fragments(names, lowest) != _fragments(known, lowest)
    ]
    bonds = f" (bonds there and not the other way: {ends_.changes[missing] or 'none'})"
    if not unlike:
        what = (
            f"One way the imaginary mode leads to {written(known)}; what it leads to the other way"
            f"{bonds} is not in the folder."
        )
        return NoStep(name, (what, *_further(ends_, (known,))))
    words = [
        f"GUESS: one way the imaginary mode leads to {written(known)}; the other way{bonds} it meets "
        f"nothing, and {written(unlike[0])} is taken because it balances.",
        *_further(ends_, (known, unlike[0])),
    ]
    return ProposedStep(known, unlike[0], name, tuple(words), sure=False)


def _by_balance(name: str, ends_: Ends, lowest: Mapping[str, Member]) -> ProposedStep | NoStep:
    """Propose a step where there is no mode to follow: two sets that balance and differ in bonds."""
    no_mode = "There is no mode and no Hessian to follow."
    unlike: dict[Fragments, Names] = {}
    for names in ends_.others:
        unlike.setdefault(_fragments(names, lowest), names)
    if len(unlike) < 2:
        listed = written(next(iter(unlike.values()))) if unlike else "nothing"
        what = f"{no_mode} Only {listed} has its atoms and charge, and a step needs two sides."
        return NoStep(name, (what,))
    one, other = list(unlike.values())[:2]
    words = (f"GUESS: {no_mode[:-1]}; both sides balance, no more.", *_further(ends_, (one, other)))
    return ProposedStep(one, other, name, words, sure=False)


def _same_ends(
    name: str, side: Names, ends_: Ends, found: Members, lowest: Mapping[str, Member]
) -> ProposedStep | NoStep:
    """Propose a step between two conformers, if the saddle point has one on either side."""
    saddle = found.saddles[name]
    alike = found.conformers[side[0]] if len(side) == 1 else ()
    if len(alike) > 1:
        shapes = [found.minima[each].calculation for each in alike]
        near = nearest(saddle.calculation, shapes)
        if None not in near and near[0] != near[1]:
            one, other = (alike[int(k or 0)] for k in near)
            said = "GUESS: both sides have the same bonds; the ends are the conformers nearest in shape."
            return ProposedStep((one,), (other,), name, (said,), sure=False)
    unlike = [
        names
        for names in dict.fromkeys((*ends_.sides[0], *ends_.sides[1]))
        if _fragments(names, lowest) != _fragments(side, lowest)
    ]
    if unlike:
        words = (
            f"GUESS: {written(side)} matches both ways along the imaginary mode; {written(unlike[0])} "
            "is the best that differs from it.",
            *_further(ends_, (side, unlike[0])),
        )
        return ProposedStep(side, unlike[0], name, words, sure=False)
    what = (
        f"Both ways the imaginary mode leads to {written(side)}: the two ends are the same species, "
        "and a step must change something."
    )
    mode = saddle.calculation.wavenumbers_cm
    if mode is not None and mode[0] > -100.0 and len(side) == 1:
        what += " It may be a rotation, or a minimum not quite reached."
    return NoStep(name, (what, *_further(ends_, (side,))))


def _nothing_matches(ends_: Ends) -> tuple[str, ...]:
    if not ends_.others:
        return ("No set of minima in the folder has its atoms, charge and spin.",)
    listed = "; ".join(written(names) for names in ends_.others[:MOST_LISTED])
    bonds = " and ".join(change or "none" for change in ends_.changes)
    return (
        "The imaginary mode leads to none of the minima in the folder, "
        f"either way (bonds made: {bonds}).",
        f"These have its atoms and charge: {listed}.",
    )


def _further(ends_: Ends, taken: Sequence[Names]) -> list[str]:
    """List the sets that balance and were not taken, on the side that they fit."""
    sentences = []
    for k, side in enumerate(ends_.sides):
        rest = [names for names in side if names not in taken]
        if rest and not (k and side == ends_.sides[0]):
            near = written(next(iter(names for names in side if names in taken), side[0]))
            sentences.append(f"The same way as {near} lie {_listed(rest)}.")
    rest = [names for names in ends_.others if names not in taken]
    if rest:
        sentences.append(f"These balance too: {_listed(rest)}.")
    return sentences


def _listed(sets: Sequence[Names]) -> str:
    more = f"; and {len(sets) - MOST_LISTED} more" if len(sets) > MOST_LISTED else ""
    return "; ".join(written(names) for names in sets[:MOST_LISTED]) + more


def _fragments(names: Names, lowest: Mapping[str, Member]) -> Fragments:
    return tuple(sorted(part for name in names for part in lowest[name].grouped.fragments))


def equals(name: str, lowest: Mapping[str, Member]) -> str:
    """Say which other sets of minima have the atoms and the charge of one; empty where none has."""
    grouped = {each: member.grouped for each, member in lowest.items()}
    sets = [names for names in balances(grouped[name], grouped) if names != (name,)]
    return _listed(sets)


def associations(lowest: Mapping[str, Member]) -> list[ProposedStep]:
    """Propose the barrierless steps that build each complex from two other minima.

    A complex falls apart where its bond graph, with some factor of the family, is that of the two
    side by side.
    """
    by_parts: dict[Fragments, list[str]] = {}
    for name, member in lowest.items():
        by_parts.setdefault(member.grouped.fragments, []).append(name)
    steps: list[ProposedStep] = []
    for name, member in lowest.items():
        calc = member.calculation
        ways: dict[tuple[str, str], Fragments] = {}
        graphs = family(atom_kinds(calc), calc.positions_angstrom)
        for parts in sorted(
            (parts for parts in graphs if len(parts) > 1), key=lambda parts: graphs[parts].off
        ):
            for one, rest in _splits(parts, by_parts):
                for a in by_parts[one]:
                    for b in by_parts[rest]:
                        ways.setdefault((a, b) if (a, b) <= (b, a) else (b, a), parts)
        for pair in sorted(ways):
            two = {each: lowest[each].grouped for each in sorted(pair)}
            if name in pair or tuple(sorted(pair)) not in balances(member.grouped, two, 2):
                continue
            order = list(lowest)
            left = tuple(sorted(pair, key=order.index))
            formulas = " and ".join(hill(part.numbers) for part in ways[pair])
            words = [f"GUESS: no saddle point; {name} falls apart into {formulas}."]
            if ways[pair] != member.grouped.fragments:
                words.append("Its longest bond is counted as none for that.")
            steps.append(ProposedStep(left, (name,), None, tuple(words), sure=False))
    return steps


def _splits(
    parts: Fragments, by_parts: Mapping[Fragments, Sequence[str]]
) -> list[tuple[Fragments, Fragments]]:
    """Return the ways to part fragments into two sets that are there."""
    whole = Counter(parts)
    found = []
    for one in by_parts:
        mine = Counter(one)
        if len(one) < len(parts) and mine <= whole:
            rest = tuple(sorted((whole - mine).elements()))
            if rest in by_parts:
                found.append((one, rest))
    return found
