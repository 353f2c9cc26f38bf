"""The answer at every point as columns, for numpy and pandas."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from morphology import kind_name

if TYPE_CHECKING:
    from cable.noise.fluctuations import Fluctuations


def columns(field: Fluctuations) -> dict[str, NDArray[Any]]:
    """(N,) columns over the points of the tree, named as in the files that the command `table` writes."""
    tree = field.model.tree
    x, y, z = tree.xyz_um.T
    found: dict[str, NDArray[Any]] = {
        "swc_id": tree.ids,
        "kind": np.array([kind_name(kind) for kind in tree.kinds.tolist()]),
        "x_um": x,
        "y_um": y,
        "z_um": z,
        "radius_um": tree.radius_um,
        "path_um": tree.path_um,
        "branch_order": tree.branch_order,
        "mean_mV": field.mean_mV,
        "sd_mV": field.sd_mV,
        "variance_mV2": field.variance_mV2,
        **{f"variance_{name}_mV2": part for name, part in field.variance_by_input_mV2.items()},
        "correlation_time_ms": field.correlation_time_ms,
        "input_resistance_MOhm": field.input_resistance_MOhm,
    }
    if field.upcrossing_Hz is not None:
        found["upcrossing_Hz"] = field.upcrossing_Hz
    return found


def structured(named: dict[str, NDArray[Any]]) -> NDArray[np.void]:
    """(N,) one structured array, a field a column."""
    length = len(next(iter(named.values()), np.zeros(0)))
    out = np.empty(length, dtype=[(name, column.dtype) for name, column in named.items()])
    for name, column in named.items():
        out[name] = column
    return out


def data_frame(named: dict[str, Any]) -> Any:
    """A pandas DataFrame of columns.

    Raises:
        ImportError: pandas is not installed; the message names the way without it.
    """
    try:
        import pandas  # type: ignore[import-untyped, unused-ignore]
    except ImportError:
        raise ImportError("pandas is not installed; to_numpy() gives the same as a structured array") from None
    return pandas.DataFrame(named)
