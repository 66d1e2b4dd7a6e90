"""How the figures of this folder look, and files of theirs that are small and the same at every run."""

import re
from pathlib import Path
from typing import TYPE_CHECKING

from decayinfer.cooling.scenario import Scenario

if TYPE_CHECKING:  # the pages can be made without matplotlib
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["AGE", "COLDEST", "COLOURS", "error_text", "new", "save"]

AGE = (300.0, 1e7)  #: ages of every figure [yr]
COLDEST = 3e6  #: T_b below which the closed forms level off [K]
COLOURS = ("#1b6f6a", "#c2571a", "#6d4a9c", "#3f3f3f")
STYLE = {
    "svg.hashsalt": "decayinfer",
    "font.size": 10,
    "axes.grid": True,
    "grid.alpha": 0.25,
    "grid.linewidth": 0.5,
}


def new(rows: int, columns: int, **options: object) -> "tuple[Figure, list[Axes]]":
    """Return a figure and its panels, row by row."""
    import matplotlib as mpl

    mpl.use("svg")
    import matplotlib.pyplot as plt

    mpl.rcParams |= STYLE
    figure, panels = plt.subplots(rows, columns, layout="constrained", squeeze=False, **options)
    return figure, list(panels.flat)


def save(figure: "Figure", path: Path) -> None:
    """Write a figure without date and author, coordinates to a hundredth of a point, nothing twice."""
    import matplotlib.pyplot as plt

    figure.savefig(path, metadata={"Date": None, "Creator": None})
    plt.close(figure)
    text = path.read_text(encoding="utf-8")
    text = re.sub(r"(?<=[ \"])-?\d+\.\d{3,}(?=[ \"\n])", lambda m: f"{float(m[0]):.2f}", text)
    text = re.sub(r'(<use xlink:href="#m[^>]*?) style="stroke: #000000[^"]*"', r"\1", text)
    text = re.sub(r"(?m) *<!--.*?-->\n|^ +| +$", "", text)
    text = re.sub(r'<g id="[^"]*">', "<g>", text)
    path.write_text(text, encoding="utf-8")


def error_text(scenario: Scenario) -> tuple[str, str]:
    """Return the largest errors of T_b and of its slope in words; a dash where nothing was fitted."""
    found = scenario.fit_error
    if not found:
        return "-", "-"
    temperature, slope = f"{found['temperature']:.2%}", f"{found['slope']:.3f}"
    if "temperature_away" in found:
        near, away = found["temperature_near_threshold"], found["temperature_away"]
        temperature = f"{away:.2%}; near the threshold {near:.2%}"
    if "slope_young" in found:
        slope += f"; from 1e3 yr {found['slope_young']:.3f}"
    return temperature, slope
