"""All that a report shows of a model, computed once and ready for the page."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from cable.desk.figures.projection import PLANES, TURNED, directions, flattest_plane
from cable.desk.figures.style import colour_map
from cable.desk.path import distance_of_site
from cable.desk.report.packed import logarithms, numbers, whole
from cable.desk.site_table import point_of_site, points_table, with_correlations
from cable.desk.tables import Column
from cable.noise.cross import by_frequency
from cable.noise.point_spectra import point_spectra_mV2_per_Hz
from cable.theory.units import one_sided_per_Hz
from morphology import kind_name
from morphology.kinds import SOMA

if TYPE_CHECKING:
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
MOST_PARTNER_VALUES = 320_000  # values of correlation and lag in the file: the sites that fit have a map of both
MOST_CURVES = 20  # sites whose pairs have curves against lag and frequency; fewer on large cells, as their number
MOST_CURVE_WORK = 640_000  # squared times that of the points is the work
FREQUENCY_HZ = np.geomspace(0.1, 1000.0, 33)  # of all points
SITE_FREQUENCY_HZ = np.geomspace(0.1, 1000.0, 65)
LAGS, LAG_TIME_CONSTANTS = 121, 5.0
MAPS_SHARE = 0.6  # of the work, about, that goes into maps of correlation
PAIR_TOLERANCE = 1e-7  # of curves to look at
VIEWS = {"xy": "x right, y up", "xz": "x right, z up", "yz": "z right, y up", TURNED: "flattest, turned"}


def page_data(field: Fluctuations, tell: Callable[[float], None] = lambda share: None) -> dict[str, Any]:
    """The numbers behind the map, the curves and the table of a report, as plain values.

    The rows are those of `table --out`: the points of the tree, then the sites that lie on none.

    Args:
        tell: hears the share of the work that is done.
    """
    model, tree = field.model, field.model.tree
    names = list(model.site_names)
    partners = names[: max(1, MOST_PARTNER_VALUES // (2 * len(tree)))]
    plain = points_table(field)
    maps = []
    for k, name in enumerate(partners):
        maps.append(model.correlation_map(name))
        tell(MAPS_SHARE * (k + 1) / len(partners))
    table = with_correlations(plain, maps, sites_only=False)
    columns, kinds = dict(table.columns), sorted(set(table.columns["kind"]))
    extra = [str(name) for name in columns["site"][len(tree) :]]
    return {
        "points": len(tree),
        "rows": len(table),
        "columns": [{"key": key, **_column(values)} for key, values in columns.items() if key not in ("site", "kind")],
        "order": list(columns),
        "kinds": kinds,
        "kind": whole(np.array([kinds.index(k) for k in columns["kind"]])),
        "sites": _sites(model, extra),
        "partners": partners,
        "parts": list(model.part_names),
        "threshold_mV": model.threshold_mV,
        **_shape(model, extra),
        "views": [
            {"name": name, "words": VIEWS[name], "axes": directions(tree, name).tolist()} for name in (*PLANES, TURNED)
        ],
        "view": flattest_plane(tree),
        "colours": _colours(),
        **_curves(field, names[: sites_with_curves(len(tree))], extra),
    }


def _column(values: Column) -> dict[str, Any]:
    array = np.asarray(values)
    return whole(array) if array.dtype.kind in "iu" else numbers(array)


def sites_with_curves(points: int) -> int:
    """For how many sites of a cell of so many points the pairs get curves."""
    return min(MOST_CURVES, max(2, math.isqrt(MOST_CURVE_WORK // points)))


def _sites(model: CableModel, extra: list[str]) -> list[dict[str, Any]]:
    """Each site with its row in the table and its distance from the soma."""
    points = len(model.tree)
    found = []
    for name in model.site_names:
        row = points + extra.index(name) if name in extra else point_of_site(model, name)
        found.append({"name": name, "row": row, "from_soma_um": distance_of_site(model, name)})
    return found


def _shape(model: CableModel, extra: list[str]) -> dict[str, Any]:
    """What the drawing needs: who hangs on whom, between which fractions an edge is cable, the spheres."""
    tree, shape = model.tree, model.tree.shape
    on_way = set(tree.path_to(shape.soma).tolist())
    anchors = []
    for name in extra:
        row, place = point_of_site(model, name), model.site_places[name]
        if row is None:  # a site between two points hangs on the one that is nearer to the soma
            row = place.row if place.row in on_way else int(tree.parent[place.row])
        anchors.append(row)
    spheres = np.flatnonzero(shape.sphere_area_um2 > 0)
    tips = []
    for kind in [k for k in np.unique(shape.kind[shape.length_um > 0]).tolist() if k != SOMA][:8]:
        rows = np.flatnonzero((shape.kind == kind) & (shape.length_um > 0))
        away = np.linalg.norm(tree.xyz_um[rows] - tree.xyz_um[shape.soma], axis=1)
        word = kind_name(kind) if kind_name(kind) != str(kind) else f"kind {kind}"
        tips.append({"word": word, "row": int(rows[np.argmax(away)])})
    return {
        "soma": int(shape.soma),
        "parent": whole(np.r_[tree.parent, anchors]),
        "near": numbers(shape.near),
        "far": numbers(shape.far),
        "radius_near_um": numbers(shape.radius_near_um),
        "radius_far_um": numbers(shape.radius_far_um),
        "spheres": [
            {"row": int(row), "radius_um": float(np.sqrt(shape.sphere_area_um2[row] / (4 * np.pi)))} for row in spheres
        ],
        "kind_labels": tips if len(tips) > 1 else [],
    }


def _colours() -> dict[str, list[str]]:
    """The map's colours on a light ground, and those on a dark one, whose darkest end is left out."""
    import matplotlib as mpl
    from matplotlib.colors import to_hex

    dark = mpl.colormaps["viridis"](np.linspace(0.14, 1.0, 64))
    return {
        "light": [to_hex(c) for c in colour_map()(np.linspace(0, 1, 64))],
        "dark": [to_hex(c) for c in dark],
    }


def _curves(field: Fluctuations, names: list[str], extra: list[str]) -> dict[str, Any]:
    """Spectra of every row in all, and of `names` by input; correlation against lag and coherence of their pairs."""
    model = field.model
    density = point_spectra_mV2_per_Hz(model, FREQUENCY_HZ)
    points = len(model.tree)
    rows = np.r_[np.arange(points), [points + model.site_names.index(name) for name in extra]].astype(int)
    cross = by_frequency(model.refined.point, [model.node_of(name) for name in names], SITE_FREQUENCY_HZ)
    own = one_sided_per_Hz(np.einsum("paaf->apf", cross).real)
    return {
        "spectrum": {
            "frequency_Hz": _rounded(FREQUENCY_HZ),
            "density": logarithms(density[rows]),
            "site_frequency_Hz": _rounded(SITE_FREQUENCY_HZ),
            "parts": {name: [_rounded(part) for part in parts] for name, parts in zip(names, own, strict=True)},
        },
        "curves": _pairs(field, names, cross.sum(axis=0)),
    }


def _pairs(field: Fluctuations, names: list[str], cross: NDArray[np.complex128]) -> dict[str, Any] | None:
    """Correlation against lag, and coherence, of all pairs among `names` that fluctuate; None where none does.

    Args:
        cross: (names, names, F) their cross-spectra.
    """
    from cable.noise.covariance import covariances

    kept = [k for k, name in enumerate(names) if field.at(name).variance_mV2 > 0]
    if not kept:
        return None
    named = [names[k] for k in kept]
    lag = np.linspace(0.0, LAG_TIME_CONSTANTS * field.model.membrane.time_constant_ms, LAGS)
    found = covariances(field.model, tuple(named), lag, PAIR_TOLERANCE)
    sd = np.sqrt(np.diag(found.at_zero_mV2.sum(axis=0)))
    own = np.einsum("aaf->af", cross).real
    with np.errstate(divide="ignore", invalid="ignore"):
        coherence = np.minimum(np.abs(cross) ** 2 / (own[:, None] * own[None]), 1.0)[np.ix_(kept, kept)]
    return {
        "sites": named,
        "lag_ms": _rounded(lag),
        "correlation": numbers((found.covariance_mV2 / np.outer(sd, sd)[:, :, None]).ravel()),
        "coherence": numbers(coherence.ravel()),
    }


def _rounded(values: Floats) -> list[float | None]:
    """Values for a curve, six digits each; None where there is none."""
    return [float(f"{v:.6g}") if np.isfinite(v) else None for v in values.tolist()]
