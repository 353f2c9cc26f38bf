"""One cell twice: as a tree of ours and as the oracles' list of cylinders."""

from __future__ import annotations

import numpy as np

from morphology import CellTree
from noise.cells import arbor
from oracles.plain import Cell, Cylinder, Sphere

SOMA_UM = 7.0


def untapered_pair(seed: int, points: int) -> tuple[CellTree, Cell]:
    """A random tree whose neurites have one radius of 0.5 µm, rows as nodes; 20 kΩ cm², 150 Ω cm, 1 µF/cm²."""
    tree = arbor(seed, points, untapered=True)
    cylinders = []
    for child in range(1, points):
        parent = int(tree.parent[child])
        apart = float(np.linalg.norm(tree.xyz_um[child] - tree.xyz_um[parent]))
        cylinders.append(Cylinder(parent, child, apart - SOMA_UM * (parent == 0), 1.0))
    return tree, Cell(tuple(cylinders), (Sphere(0, 4 * np.pi * SOMA_UM**2),))
