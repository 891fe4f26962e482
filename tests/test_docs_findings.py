"""Every finding code of the package is documented in docs/findings.md, and no other."""

from __future__ import annotations

import ast
import re
from pathlib import Path

from thermo_pp.names import SEVERITIES

ROOT = Path(__file__).parents[1]
CODE = re.compile(r"[a-z]+(-[a-z]+)+")


def used() -> dict[str, str]:
    """Codes that the package gives findings, and the file of each."""
    found: dict[str, str] = {}
    for path in sorted((ROOT / "thermo_pp").rglob("*.py")):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            codes = _codes(node) if isinstance(node, ast.Call) else _assigned(node)
            found |= dict.fromkeys(codes, str(path.relative_to(ROOT)))
    return found


def _codes(call: ast.Call) -> list[str]:
    """Return the code of Finding("code", ...), of code="code", and of any code beside a severity."""
    for keyword in call.keywords:
        if keyword.arg == "code" and isinstance(keyword.value, ast.Constant):
            return [str(keyword.value.value)]
    texts = [_text(argument) for argument in call.args]
    if isinstance(call.func, ast.Name) and call.func.id == "Finding":
        return [texts[0]] if texts and texts[0] else []
    severities = [
        _text(argument) in SEVERITIES or getattr(argument, "id", "") == "severity"
        for argument in call.args
    ]
    beside = [
        any(severities[max(0, k - 1) : k]) or any(severities[k + 1 : k + 2])
        for k in range(len(texts))
    ]
    return [text for text, near in zip(texts, beside, strict=True) if near and CODE.fullmatch(text)]


def _assigned(node: ast.AST) -> list[str]:
    """Return the code of ``code = "code"``."""
    if isinstance(node, ast.Assign) and getattr(node.targets[0], "id", "") == "code":
        return [text for text in [_text(node.value)] if text]
    return []


def _text(node: ast.expr) -> str:
    return node.value if isinstance(node, ast.Constant) and isinstance(node.value, str) else ""


def documented() -> set[str]:
    text = (ROOT / "docs" / "findings.md").read_text(encoding="utf-8")
    return set(re.findall(r"^\| `([a-z-]+)` \|", text, re.MULTILINE))


def test_every_code_is_documented() -> None:
    codes = used()
    assert "mode-count" in codes
    missing = {code: file for code, file in codes.items() if code not in documented()}
    assert not missing


def test_every_documented_code_is_used() -> None:
    assert not documented() - set(used())


def test_every_row_says_what_it_means_and_what_to_do() -> None:
    text = (ROOT / "docs" / "findings.md").read_text(encoding="utf-8")
    for line in text.splitlines():
        if line.startswith("| `"):
            cells = [cell.strip() for cell in line.strip("|").split("|")]
            assert len(cells) == 4, line
            assert all(cells), line
            assert set(cells[1].replace(",", " ").split()) <= {"error", "warning", "note"}, line
