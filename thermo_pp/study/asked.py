"""``[effective]`` and ``[[paths]]``: what is asked of the mechanism."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TypedDict

from msgspec import UnsetType

from thermo_pp.errors import StudyError
from thermo_pp.mechanism import RatePoint, Step
from thermo_pp.nearest import suggestion
from thermo_pp.study.check import place
from thermo_pp.study.keys import StudyKeys
from thermo_pp.study.points import make_point


class Question(TypedDict):
    """What is asked of the mechanism: the fields of a Mechanism of these names."""

    reactant: str | None
    products: tuple[str, ...]
    catalyst: str | None
    paths: tuple[tuple[int, ...], ...]
    path_names: tuple[str, ...]
    point: RatePoint | None


def make_question(keys: StudyKeys, steps: Sequence[Step], file: str) -> Question:
    """Turn ``[effective]`` and ``[[paths]]`` into what is asked of the mechanism."""
    question = Question(
        reactant=None, products=(), catalyst=None, paths=(), path_names=(), point=None
    )
    effective = keys.effective
    known = list(dict.fromkeys(name for step in steps for name in step.species))
    if not isinstance(effective, UnsetType):
        given = [
            name
            for name in ("reactant", "catalyst")
            if not isinstance(getattr(effective, name), UnsetType)
        ]
        if len(given) != 1:
            raise StudyError(
                "both a reactant and a catalyst" if given else "neither a reactant nor a catalyst",
                where=place(file, "effective"),
                mend="give exactly one of reactant and catalyst",
            )
        start = _known(getattr(effective, given[0]), known, place(file, "effective", given[0]))
        products = [effective.product] if isinstance(effective.product, str) else effective.product
        where = place(file, "effective", "product")
        for name in products:
            _known(name, known, where)
            if name == start or products.count(name) > 1:
                twice = f"is the {given[0]} too" if name == start else "is listed twice"
                raise StudyError(
                    f"the product {name!r} {twice}", where=where, mend="name what is made, once"
                )
        question["reactant"] = start if given[0] == "reactant" else None
        question["catalyst"] = start if given[0] == "catalyst" else None
        question["products"] = tuple(products)
        question["point"] = make_point(effective, known, file)
    for number, path in enumerate(keys.paths):
        where = place(file, "paths", number, "steps")
        for entry in path.steps:
            if not 1 <= abs(entry) <= len(steps):
                raise StudyError(
                    f"there is no step {entry}",
                    where=where,
                    mend=f"steps count from 1 to {len(steps)}; a negative number runs one backward",
                )
        if path.name in question["path_names"]:
            raise StudyError(
                f"two paths are called {path.name!r}",
                where=place(file, "paths", number, "name"),
                mend="give each path a name of its own",
            )
        question["path_names"] += (path.name,)
        # 0-based; the complement of a number stands for the step run backward
        question["paths"] += (tuple(n - 1 if n > 0 else n for n in path.steps),)
    return question


def _known(name: str, known: Sequence[str], where: str) -> str:
    if name not in known:
        raise StudyError(
            f"{name!r} is not made or used by any step",
            where=where,
            mend=suggestion(name, known, "species"),
        )
    return name
