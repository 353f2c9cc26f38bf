"""Impedance of a tree by the general finite-element library scikit-fem: quadratic elements, no cable formula.

    d/ds( (pi r^2/Ri) dV/ds ) = 2 pi r sqrt(1 + r'^2) (1/Rm + i omega Cm) V - (point current)
with r linear in s along each piece, so that tapering frusta are exact. The mesh coordinate is the path
distance; two daughters overlap in it but share only the branch node, and that is all the equation sees.
"""

from itertools import pairwise

import numpy as np
import skfem
from scipy.sparse import csc_array
from scipy.sparse.linalg import splu

from .plain import Cell


@skfem.BilinearForm
def _axial(u, v, w):
    return w.conductivity * np.pi * w.radius**2 * u.grad[0] * v.grad[0]


@skfem.BilinearForm
def _membrane(u, v, w):
    return 2.0 * np.pi * w.radius * w.slant * u * v


def _mesh(cell: Cell, n: int) -> tuple[skfem.MeshLine, np.ndarray]:
    """Mesh whose first points are the cell's nodes, and the path distance (N,) of those nodes from node 0."""
    path = np.full(cell.node_count, np.nan)
    path[0] = 0.0
    points: list[float] = [0.0] * cell.node_count
    elements: list[tuple[int, int]] = []
    for cylinder in cell.cylinders:
        start = path[cylinder.parent]
        path[cylinder.child] = start + cylinder.length_um
        chain = [cylinder.parent, *range(len(points), len(points) + n - 1), cylinder.child]
        points += [start + cylinder.length_um * k / n for k in range(1, n)]
        elements += list(pairwise(chain))
    points[: cell.node_count] = list(path)
    return skfem.MeshLine(np.array([points]), np.array(elements).T), path


def impedance_GOhm(
    cell: Cell,
    frequency_Hz: float,
    n: int = 100,
    far_diameter_um: tuple[float, ...] | None = None,
) -> np.ndarray:
    """Input and transfer impedances (N, N) between the nodes of a cell whose cylinders come parents first.

    n: quadratic elements a cylinder (nodal error of order n^-4).
    far_diameter_um: diameter at the child end of each cylinder, which makes it a frustum; default no taper.
    """
    mesh, path = _mesh(cell, n)
    whole = skfem.Basis(mesh, skfem.ElementLineP2())
    omega = 2e-3 * np.pi * frequency_Hz
    A = csc_array((whole.N, whole.N), dtype=complex)
    for j, cylinder in enumerate(cell.cylinders):
        part = skfem.Basis(mesh, skfem.ElementLineP2(), elements=np.arange(j * n, (j + 1) * n))
        near = cylinder.diameter_um / 2.0
        far = near if far_diameter_um is None else far_diameter_um[j] / 2.0
        slope = (far - near) / cylinder.length_um
        position = part.global_coordinates()[0] - path[cylinder.parent]
        fields = {"radius": near + slope * position, "slant": np.sqrt(1.0 + slope**2)}
        y = 10.0 / cylinder.Rm_ohm_cm2 + 1j * omega * 0.01 * cylinder.Cm_uF_cm2
        axial = _axial.assemble(part, conductivity=1e5 / cylinder.Ri_ohm_cm, **fields)
        A = A + axial + y * _membrane.assemble(part, **fields)
    dofs = whole.nodal_dofs[0, : cell.node_count]
    lumped = np.zeros(whole.N, dtype=complex)
    for sphere in cell.spheres:
        lumped[dofs[sphere.node]] += sphere.leak_nS + 1j * omega * sphere.capacitance_pF
    where = np.arange(whole.N)
    factors = splu(csc_array(A + csc_array((lumped, (where, where)))))
    unit = np.zeros((whole.N, cell.node_count), dtype=complex)
    unit[dofs, np.arange(cell.node_count)] = 1.0
    return factors.solve(unit)[dofs]
