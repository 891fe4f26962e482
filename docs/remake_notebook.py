"""Run docs/notebook.ipynb and keep of its outputs what was printed; run it after changing a cell."""

from __future__ import annotations

import os
from pathlib import Path

import nbformat
from nbclient import NotebookClient
from nbformat import NotebookNode

ROOT = Path(__file__).parents[1]
NOTEBOOK = Path(__file__).with_name("notebook.ipynb")


def executed(path: Path = NOTEBOOK) -> NotebookNode:
    """Return the notebook with the outputs of a fresh run in its folder; CellExecutionError where a cell fails."""
    book = nbformat.read(path, as_version=4)
    client = NotebookClient(
        book, timeout=120, kernel_name="python3", resources={"metadata": {"path": str(path.parent)}}
    )
    paths = [str(ROOT), *filter(None, [os.environ.get("PYTHONPATH")])]
    client.execute(env={**os.environ, "PYTHONPATH": os.pathsep.join(paths)})
    return book


def printed(book: NotebookNode) -> list[str]:
    """Return what each cell of code printed."""
    return [
        "".join(one.text for one in cell.outputs if one.get("name") == "stdout")
        for cell in book.cells
        if cell.cell_type == "code"
    ]


def text(book: NotebookNode) -> str:
    """Return the file of an executed notebook: printed text alone, nothing that differs between runs."""
    texts = iter(printed(book))
    for number, cell in enumerate(book.cells):
        cell.id, cell.metadata = f"cell-{number}", {}
        if cell.cell_type == "code":
            words, cell.execution_count = next(texts), None
            stream = nbformat.v4.new_output("stream", name="stdout", text=words)
            cell.outputs = [stream] if words else []
    book.metadata = {
        "kernelspec": {"display_name": "Python 3", "language": "python", "name": "python3"},
        "language_info": {"name": "python"},
    }
    return str(nbformat.writes(book)) + "\n"


if __name__ == "__main__":
    NOTEBOOK.write_text(text(executed()), encoding="utf-8")
