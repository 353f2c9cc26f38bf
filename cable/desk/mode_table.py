"""Modes as a table, as sentences and as quantities to draw."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from cable.desk.quantities import Quantity
from cable.desk.tables import Table
from morphology import CellTree, kind_name

if TYPE_CHECKING:
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.modes import Modes

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class ModeQuantity(Quantity):
    """One mode's pattern, as a quantity that a map can show."""

    pattern_mV: tuple[float, ...] = ()

    def values(self, field: Fluctuations) -> Floats:
        """(N,) the pattern at every point."""
        return np.array(self.pattern_mV)


def mode_table(tree: CellTree, modes: Modes) -> Table:
    """One row per point of the cell: where it is, and the pattern of each mode there."""
    columns = {"swc_id": tree.ids, "kind": np.array([kind_name(k) for k in tree.kinds]), "path_um": tree.path_um}
    return Table(columns | {f"mode_{k}_mV": pattern for k, pattern in enumerate(modes.pattern_mV, start=1)})


def mode_quantities(modes: Modes) -> list[ModeQuantity]:
    """The modes as quantities to draw."""
    return [
        ModeQuantity(f"mode {k}", f"mode {k}: {100 * share:.1f} % (mV)", pattern_mV=tuple(pattern.tolist()))
        for k, (share, pattern) in enumerate(zip(modes.share, modes.pattern_mV, strict=True), start=1)
    ]


def mode_sentences(modes: Modes) -> list[str]:
    """How many voltages there are, in words."""
    shares = ", ".join(f"{100 * share:.1f}" for share in modes.share)
    number, error = modes.participation, modes.participation_se
    told = f"{number:.3g}" if error < 0.005 * number else f"{number:.3g} ± {error:.1g}"
    first = "The first mode explains" if len(modes.share) == 1 else f"The first {len(modes.share)} modes explain"
    return [
        f"The participation number is {told}: so many independent voltages would spread the variance alike.",
        f"{first} {100 * modes.share.sum():.1f} % of it (in per cent: {shares}).",
    ]
