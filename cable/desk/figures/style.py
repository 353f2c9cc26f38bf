"""One look for all figures, and how a figure becomes a file. No global setting of matplotlib is changed."""

from __future__ import annotations

import math
import textwrap
import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from functools import cache
from typing import Any

import matplotlib as mpl
import numpy as np
from matplotlib.axes import Axes
from matplotlib.axis import Axis
from matplotlib.colors import ListedColormap, Normalize
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter
from numpy.typing import NDArray

from cable.desk.figures.shown import ShownFigure
from cable.desk.files import Output
from cable.desk.messages import shown, version

FIGURE_ENDINGS = (".png", ".svg", ".pdf")
MM = 1 / 25.4  # inches
SUPERSCRIPTS = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
PT_PER_MM = 72 / 25.4
COLUMN_MM, PAGE_MM = 85.0, 170.0
INK, GREY, PALE = "#1a1a1a", "#6b6b6b", "#c9c9c9"
DPI, RASTER_DPI = 300, 450  # of an image; of what a vector file carries as an image
RASTER_ABOVE = 5000  # pieces of a drawing from which vector files carry it as an image

STYLE: dict[str, Any] = {
    "font.family": "DejaVu Sans",
    "font.size": 7.0,
    "axes.labelsize": 7.0,
    "axes.titlesize": 7.5,
    "xtick.labelsize": 6.5,
    "ytick.labelsize": 6.5,
    "legend.fontsize": 6.5,
    "text.color": INK,
    "axes.labelcolor": INK,
    "axes.edgecolor": INK,
    "xtick.color": INK,
    "ytick.color": INK,
    "axes.linewidth": 0.6,
    "xtick.major.width": 0.6,
    "ytick.major.width": 0.6,
    "xtick.major.size": 2.5,
    "ytick.major.size": 2.5,
    "xtick.direction": "out",
    "ytick.direction": "out",
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.unicode_minus": True,
    "lines.linewidth": 1.0,
    "text.parse_math": False,  # names of files and sites are text, whatever signs they hold
    "text.usetex": False,
    "figure.facecolor": "white",
    "savefig.facecolor": "white",
    "svg.fonttype": "none",
    "svg.hashsalt": "cablenoise",
    "pdf.fonttype": 42,
    "path.simplify": True,
}


@contextmanager
def styled() -> Iterator[None]:
    """Draw and save inside this: our settings hold here and nowhere else."""
    with mpl.rc_context(), warnings.catch_warnings():
        mpl.rcdefaults()
        mpl.rcParams.update(STYLE)  # type: ignore[arg-type]
        # a name in a script which the font lacks shows as boxes; that is no reason to speak
        warnings.filterwarnings("ignore", message="Glyph .* missing from")
        yield


@cache
def colour_map() -> ListedColormap:
    """Perceptually uniform, safe for the colour-blind; its palest end, faint on paper, is left out."""
    return ListedColormap(mpl.colormaps["viridis"](np.linspace(0.0, 0.92, 256)), name="viridis to 0.92")


def scale_of(values: NDArray[np.float64]) -> Normalize:
    """The range of colours for values (...), of which some may be undefined."""
    defined = values[np.isfinite(values)]
    lowest, highest = (float(defined.min()), float(defined.max())) if defined.size else (0.0, 1.0)
    if highest - lowest < 1e-9 * max(abs(highest), 1e-300):
        lowest, highest = lowest - 0.5, highest + 0.5  # one value everywhere: the middle of the scale
    return Normalize(lowest, highest)


def bar_label(bar: Axes, label: str) -> None:
    """Name a colour bar above it, where no width of its numbers pushes the name off the page."""
    bar.set_title("\n".join(textwrap.wrap(shown(label, 60), 11)), fontsize=7.0, loc="left", pad=7.0)
    bar.locator_params(nbins=6)
    bar.spines["outline"].set_linewidth(0.5)


def figure(width_mm: float, height_mm: float) -> Figure:
    """An empty figure of this size; call it inside `styled`."""
    return ShownFigure(figsize=(width_mm * MM, height_mm * MM), dpi=DPI)


def save(drawn: Figure, target: Output, title: str) -> None:
    """Write a figure in the format of the file's ending; the same figure gives the same bytes.

    Raises:
        DeskError: the file cannot be written.
    """
    kind = target.ending.removeprefix(".")
    creator = f"cablenoise {version()}"
    own: dict[str, dict[str, Any]] = {
        "png": {"Software": creator},
        "svg": {"Creator": creator, "Date": None},
        "pdf": {"Creator": creator, "CreationDate": None},
    }
    notes = {"Title": shown(title), **own[kind]}
    with target.writing() as stream:
        drawn.savefig(stream, format=kind, dpi=DPI if kind == "png" else RASTER_DPI, metadata=notes)


def plain_powers(*axes: Axis) -> None:
    """Label the decades of logarithmic axes as plain text: 0.1, 1, 10, and 10⁻³ where that is shorter."""

    def label(value: float, _: int) -> str:
        power = round(math.log10(value))
        return f"{value:g}" if -1 <= power <= 3 else "10" + str(power).translate(SUPERSCRIPTS)

    for axis in axes:
        axis.set_major_locator(LogLocator(numticks=9))
        axis.set_major_formatter(FuncFormatter(label))
        axis.set_minor_formatter(NullFormatter())
