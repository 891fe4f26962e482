"""Make the figure of this folder again: ``python docs/figures/make.py`` in the source tree."""

from pathlib import Path

import thermo_pp as tp
from thermo_pp import figures

HERE = Path(__file__).parent
STUDY = HERE.parents[1] / "fixtures" / "stack-plume" / "study.toml"


def stack_plume() -> bytes:
    """Return the SVG of the bundled study: H and G of two of its paths, 280 and 360 K."""
    profile = tp.Study.load(STUDY).profile()
    figure, axes = figures.new_figure(width_mm=figures.PAGE_MM, height_mm=88.0, columns=2)
    paths = ["SO3 → C1 → acid", "SO3 → C1 → C2 → acid"]
    figures.profile.draw_both(axes, profile, temperatures_k=[280.0, 360.0], paths=paths)
    return figures.content(figure, "svg")


if __name__ == "__main__":
    (HERE / "stack-plume.svg").write_bytes(stack_plume())
