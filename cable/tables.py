"""The tables of the program, from Python: each shows itself in a notebook and turns into numpy or pandas.

    from cable import load_scenario, tables
    tables.points(model.fluctuations()).to_pandas()

They are the tables that the commands write, with the same columns.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from cable.desk.tables import Table

if TYPE_CHECKING:
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.model import CableModel
    from cable.noise.modes import Modes
    from cable.noise.pairs import Pair
    from cable.noise.sources import Sources
    from cable.noise.spectra import Spectrum

__all__ = ["Table", "along", "modes", "pair", "points", "sites", "sources", "spectrum"]


def points(field: Fluctuations) -> Table:
    """One row a point of the tree, then the sites that lie on none."""
    from cable.desk.site_table import points_table

    return points_table(field)


def sites(field: Fluctuations) -> Table:
    """One row a site, the soma first."""
    from cable.desk.site_table import sites_table

    return sites_table(field)


def along(field: Fluctuations, site: str) -> Table:
    """One row a point on the way from the soma to a site.

    Raises:
        KeyError: the model has no such site.
        cable.desk.messages.DeskError: the site is where the soma is.
    """
    from cable.desk.path import way_table, way_to_site

    field.model.node_of(site)  # names the sites where there is none of this name
    return way_table(field, way_to_site(field.model, site))


def spectrum(found: Spectrum) -> Table:
    """One row a frequency."""
    from cable.desk.spectrum_table import spectrum_table

    return spectrum_table(found)


def pair(found: Pair) -> Table:
    """One row a lag."""
    from cable.desk.pair_table import pair_table

    return pair_table(found)


def sources(found: Sources) -> Table:
    """One row a cylinder."""
    from cable.desk.source_table import source_table

    return source_table(found)


def modes(model: CableModel, found: Modes) -> Table:
    """One row a point of the tree, one column a mode."""
    from cable.desk.mode_table import mode_table

    return mode_table(model.tree, found)
