"""The geometry of a reconstructed neuron: points, branches, solids, places. It knows no electricity.

`CellTree` is the reconstruction, `Shape` the sphere and frusta it stands for, `Zone` a part of it chosen
by filters and `Site` one place on it. Lengths are in µm, areas in µm² throughout.
"""

from morphology.findings import Finding, SwcError
from morphology.kinds import KIND_NAMES, kind_code, kind_name
from morphology.shape import Shape
from morphology.sites import Place, PlaceError, Site, Zone, ZonePart
from morphology.tree import CellTree

__all__ = [
    "KIND_NAMES",
    "CellTree",
    "Finding",
    "Place",
    "PlaceError",
    "Shape",
    "Site",
    "SwcError",
    "Zone",
    "ZonePart",
    "kind_code",
    "kind_name",
]
