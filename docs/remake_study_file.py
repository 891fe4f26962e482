"""Remake what follows from the model of the study file: its JSON Schema and the table of ``study-file.md``.

Run it after a change of ``thermo_pp/study/keys/`` (a test fails until then): ``python docs/remake_study_file.py``.
"""

from __future__ import annotations

import json
from pathlib import Path

from thermo_pp.study.check import documented_keys
from thermo_pp.study.keys import json_schema

DOCS = Path(__file__).parent
SCHEMA = DOCS.parent / "thermo_pp" / "study" / "schema.json"
PAGE = DOCS / "study-file.md"
HEAD = "| key | default | meaning |\n| --- | --- | --- |\n"


def schema_text() -> str:
    return json.dumps(json_schema(), indent=2, ensure_ascii=False) + "\n"


def table() -> str:
    return HEAD + "".join(
        f"| `{key}` | {default} | {meaning.replace('|', chr(92) + '|')} |\n"
        for key, default, meaning in documented_keys()
    )


def page_with_table(page: str) -> str:
    """Put the table in place of the one that stands in the page."""
    start = page.index(HEAD)
    end = page.find("\n\n", start)
    return page[:start] + table() + ("" if end < 0 else page[end + 1 :])


if __name__ == "__main__":
    SCHEMA.write_text(schema_text(), encoding="utf-8")
    PAGE.write_text(page_with_table(PAGE.read_text(encoding="utf-8")), encoding="utf-8")
