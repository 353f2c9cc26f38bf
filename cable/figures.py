"""The figures of the program, from Python: each call returns a matplotlib Figure to add to, show and save.

    from cable import load_scenario, figures
    figure = figures.draw_map(model.fluctuations(), "sd")
    figure.axes[0].plot(...)
    figure.savefig("map.pdf")

No setting of matplotlib is changed. The module loads matplotlib when a figure is drawn.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from cable.desk.quantities import Quantity
    from cable.noise.excursions import Excursions
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.model import CableModel
    from cable.noise.modes import Modes
    from cable.noise.pairs import Pair
    from cable.noise.sources import Sources
    from cable.noise.spectra import Spectrum

__all__ = [
    "draw_along",
    "draw_branches",
    "draw_correlations",
    "draw_excursions",
    "draw_map",
    "draw_modes",
    "draw_pair",
    "draw_sources",
    "draw_spectrum",
]
MEAN_AND_SD = ("mean", "sd")


def draw_map(
    field: Fluctuations,
    quantity: str | Iterable[str] = MEAN_AND_SD,
    *,
    inputs: Sequence[str] = (),
    with_site: str | None = None,
    plane: str | None = None,
    title: str | None = None,
) -> Figure:
    """The cell to scale with a quantity in colour, a panel each.

    Args:
        quantity: one or several of "mean", "sd", "variance", "correlation-time", "input-resistance", "share"
            (of `inputs`), and of "correlation", "lag", "source", "charge-share" (`with_site`).
        inputs: names of the inputs whose shares of the variance are drawn.
        with_site: the site of a correlation, lag, source or charge-share.
        plane: "xy", "xz", "yz", the flattest of them where not given; or "flat", however turned.
        title: the title, that of the model where not given; "" for none.

    Raises:
        cable.desk.messages.DeskError: an unknown quantity, input, site or plane.
    """
    from cable.desk.figures.map import draw_map as draw
    from cable.desk.figures.style import styled
    from cable.desk.messages import DeskError, quoted

    if plane not in (None, "xy", "xz", "yz", "flat"):
        raise DeskError(f"plane: found {quoted(plane)}, expected xy, xz, yz or flat; or leave it out")
    chosen = _quantities(field.model, quantity, inputs, with_site)
    with styled():
        return draw(field, chosen, plane, _title(field.model, title))


def draw_branches(
    field: Fluctuations,
    quantity: str | Iterable[str] = "sd",
    *,
    inputs: Sequence[str] = (),
    with_site: str | None = None,
    title: str | None = None,
) -> Figure:
    """A diagram of the branches, in which none hides another, by path distance; arguments as in `draw_map`."""
    from cable.desk.figures.branches import draw_branches as draw
    from cable.desk.figures.style import styled

    chosen = _quantities(field.model, quantity, inputs, with_site)
    with styled():
        return draw(field, chosen, _title(field.model, title))


def draw_along(field: Fluctuations, site: str, quantity: str = "sd", *, title: str | None = None) -> Figure:
    """Mean ± SD, and a quantity, on the way from the soma to a site.

    Raises:
        KeyError: the model has no such site.
        cable.desk.messages.DeskError: an unknown quantity, or a site where the soma is.
    """
    from cable.desk.figures.along import draw_along as draw
    from cable.desk.figures.style import styled
    from cable.desk.path import way_to_site

    field.model.node_of(site)  # names the sites where there is none of this name
    (chosen,) = _quantities(field.model, quantity, (), None)
    with styled():
        return draw(field, way_to_site(field.model, site), chosen, _title(field.model, title))


def draw_spectrum(found: Spectrum, *, temperature_C: float | None = None, title: str = "") -> Figure:
    """A spectrum, in all and by input, and the input impedance; thermal noise at a temperature if asked for."""
    from cable.desk.figures.spectrum import draw_spectrum as draw
    from cable.desk.figures.style import styled

    with styled():
        return draw(found, title, temperature_C)


def draw_pair(found: Pair, *, title: str = "") -> Figure:
    """Covariance against lag, coherence and phase of two sites."""
    from cable.desk.figures.pair import draw_pair as draw
    from cable.desk.figures.style import styled

    with styled():
        return draw(found, title)


def draw_correlations(model: CableModel, *, title: str | None = None) -> Figure:
    """The correlations between all sites as a matrix."""
    from cable.desk.figures.matrix import draw_matrix
    from cable.desk.figures.style import styled

    with styled():
        return draw_matrix(model.site_names, model.correlation_matrix(), _title(model, title))


def draw_sources(found: Sources, *, title: str | None = None) -> Figure:
    """What makes the variance at a site, by distance from it."""
    from cable.desk.figures.sources import draw_sources as draw
    from cable.desk.figures.style import styled

    with styled():
        return draw(found, _title(found.model, title))


def draw_excursions(found: Sequence[Excursions], *, title: str = "") -> Figure:
    """Distributions of the voltage at sites beside the Gaussian ones, and the level."""
    from cable.desk.figures.excursions import draw_excursions as draw
    from cable.desk.figures.style import styled

    with styled():
        return draw(found, title)


def draw_modes(model: CableModel, found: Modes, *, most: int = 4, title: str | None = None) -> Figure:
    """Maps of the leading modes of the voltage over the membrane.

    Args:
        most: how many of them are drawn.
    """
    from cable.desk.figures.map import draw_map as draw
    from cable.desk.figures.style import styled
    from cable.desk.mode_table import mode_quantities

    with styled():
        return draw(model.fluctuations(1e-6), mode_quantities(found)[:most], None, _title(model, title))


def _quantities(
    model: CableModel, quantity: str | Iterable[str], inputs: Sequence[str], site: str | None
) -> list[Quantity]:
    from cable.desk.messages import DeskError, choices, did_you_mean, quoted
    from cable.desk.quantities import WITH_SITE, quantities
    from cable.desk.quantities import with_site as with_this

    chosen = []
    for word in [quantity] if isinstance(quantity, str) else quantity:
        if word not in WITH_SITE:
            chosen += quantities(word, list(inputs) if word == "share" else [], list(model.part_names))
        elif site is None:
            raise DeskError(f"{word}: needs with_site; the sites are {choices(model.site_names, 'and')}")
        elif site not in model.site_names:
            raise DeskError(f"with_site: there is no site {quoted(site)}; {did_you_mean(site, model.site_names)}")
        else:
            chosen.append(with_this(word, site))
    return chosen


def _title(model: CableModel, title: str | None) -> str:
    return (model.title or model.tree.name) if title is None else title
