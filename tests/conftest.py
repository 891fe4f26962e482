"""For all tests: nothing is remembered in, or taken from, the user's own cache folder."""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

if TYPE_CHECKING:
    from thermo_pp.study.answers import Answers


@pytest.fixture(autouse=True, scope="session")
def own_cache(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Path]:
    """Give the tests, and the programs they start, a cache folder of their own."""
    folder = tmp_path_factory.mktemp("cache")
    before = os.environ.get("XDG_CACHE_HOME")
    os.environ["XDG_CACHE_HOME"] = str(folder)
    yield folder
    if before is None:
        del os.environ["XDG_CACHE_HOME"]
    else:
        os.environ["XDG_CACHE_HOME"] = before


@pytest.fixture(scope="session")
def bundled_answers() -> Answers:
    """What a report of the bundled study shows, at two temperatures."""
    from thermo_pp.study.load import Study
    from thermo_pp.study.run import answer

    study = Path(__file__).parents[1] / "fixtures" / "stack-plume" / "study.toml"
    return answer(Study.load(study, temperatures=["280 K", "298.15 K"]))
