"""Invented trees, from a sphere to an arbor grown from a seed: for teaching, tests and demonstrations."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from morphology.kinds import APICAL, BASAL, SOMA
from morphology.pyramidal import neuron
from morphology.structure import Floats, Ints
from morphology.tree import CellTree

__all__ = ["ball_and_stick", "cylinder", "neuron", "rall_tree", "random_arbor", "sphere"]


def _positive(**quantities: float) -> None:
    for name, value in quantities.items():
        if not (np.isfinite(value) and value > 0):
            raise ValueError(f"{name}: expected a positive number, found {value}")


def _at_least(least: int, **counts: int) -> None:
    for name, value in counts.items():
        if value < least:
            raise ValueError(f"{name}: expected {least} or more, found {value}")


def _tree(kinds: Ints, xyz_um: Floats, radius_um: Floats, parent: Ints, name: str) -> CellTree:
    return CellTree(np.arange(1, len(kinds) + 1), kinds, xyz_um, radius_um, parent, name)


def sphere(radius_um: float) -> CellTree:
    """One soma point: an isopotential sphere.

    Raises:
        ValueError: a size that is not positive (so for all functions here).
    """
    _positive(radius_um=radius_um)
    return _tree(np.array([SOMA]), np.zeros((1, 3)), np.array([radius_um]), np.array([-1]), "sphere")


def cylinder(length_um: float, diameter_um: float, points: int = 2, kind: int = BASAL) -> CellTree:
    """A straight cable of constant diameter along x, sampled at `points` even steps, without a soma."""
    _positive(length_um=length_um, diameter_um=diameter_um)
    _at_least(2, points=points)
    xyz = np.zeros((points, 3))
    xyz[:, 0] = np.linspace(0.0, length_um, points)
    radius = np.full(points, diameter_um / 2)
    return _tree(np.full(points, kind), xyz, radius, np.arange(points) - 1, "cylinder")


def ball_and_stick(
    soma_radius_um: float, length_um: float, diameter_um: float, points: int = 11, kind: int = BASAL
) -> CellTree:
    """A spherical soma and one straight dendrite of `points` rows.

    The dendrite's first point lies on the soma's surface, so `length_um` is the length of its cable.
    """
    _positive(soma_radius_um=soma_radius_um, length_um=length_um, diameter_um=diameter_um)
    _at_least(2, points=points)
    xyz = np.zeros((points + 1, 3))
    xyz[1:, 0] = soma_radius_um + np.linspace(0.0, length_um, points)
    radius = np.r_[soma_radius_um, np.full(points, diameter_um / 2)]
    kinds = np.r_[SOMA, np.full(points, kind)]
    return _tree(kinds, xyz, radius, np.arange(points + 1) - 1, "ball and stick")


def rall_tree(
    parent_diameter_um: float,
    lengths_um: Sequence[float],
    share: float = 0.5,
    points_per_branch: int = 2,
    soma_radius_um: float | None = None,
) -> CellTree:
    """A binary tree which obeys the 3/2 law at every branch point and so equals one cylinder.

    At each branch point the first daughter gets `share` of the parent's d^1.5, the second the rest. The step
    of the radius is a zero-length edge: a daughter's first row lies in the parent's place with its own
    radius. `lengths_um` has one length per branch order for daughters of equal diameter (share 0.5); an
    unequal daughter's length goes with the root of its diameter, so that its electrotonic length is that of
    its sister. With `soma_radius_um` the tree stands on a spherical soma's surface.

    Source: Rall 1962, Ann NY Acad Sci 96:1071-1092.
    """
    _positive(parent_diameter_um=parent_diameter_um, share=share, rest=1.0 - share)
    _positive(**{f"lengths_um[{i}]": float(v) for i, v in enumerate(lengths_um)})
    _at_least(1, lengths_um=len(lengths_um))
    _at_least(2, points_per_branch=points_per_branch)
    kinds, places, radii, parents = [], [], [], []
    if soma_radius_um is not None:
        _positive(soma_radius_um=soma_radius_um)
        kinds, places, radii, parents = [SOMA], [np.zeros(3)], [soma_radius_um], [-1]
    start = np.array([soma_radius_um or 0.0, 0.0, 0.0])
    branches = [(len(kinds) - 1, start, parent_diameter_um, 0.0)]
    along = np.linspace(0.0, 1.0, points_per_branch)[:, None]
    for order, length in enumerate(lengths_um):
        even = parent_diameter_um * 2.0 ** (-2 * order / 3)
        grown = []
        for parent, place, diameter, angle in branches:
            direction = np.array([np.cos(angle), np.sin(angle), 0.0])
            path = place + along * direction * length * np.sqrt(diameter / even)
            first = len(kinds)
            kinds += [BASAL] * points_per_branch
            places += list(path)
            radii += [diameter / 2] * points_per_branch
            parents += [parent, *range(first, first + points_per_branch - 1)]
            for part, turn in ((share, 0.5), (1.0 - share, -0.5)):
                grown.append((len(kinds) - 1, path[-1], diameter * part ** (2 / 3), angle + turn / (order + 1)))
        branches = grown
    return _tree(np.array(kinds), np.array(places), np.array(radii), np.array(parents), "Rall tree")


def random_arbor(
    seed: int | np.random.Generator,
    points: int,
    soma_radius_um: float = 8.0,
    stems: int = 5,
    apical: bool = True,
) -> CellTree:
    """A branched, tapering arbor of exactly `points` rows, of unequal lengths and radii, on a spherical soma.

    All growing tips take one step at a time; some split, some stop. With `apical` the last stem is of that
    kind, the others are basal. Meant to be irregular, not to look like a particular cell.
    """
    _positive(soma_radius_um=soma_radius_um)
    _at_least(1, points=points, stems=stems)
    rng = np.random.default_rng(seed)
    stems = min(stems, max((points - 1) // 3, min(1, points - 1)))
    xyz, radius = np.zeros((points, 3)), np.full(points, soma_radius_um, dtype=float)
    kinds, parent = np.full(points, SOMA), np.full(points, -1)
    heading = _unit(rng.normal(size=(points, 3)))
    tips = np.arange(1, stems + 1)
    # a hair inside the surface, lest rounding leave a cable of no length between the two
    xyz[tips] = soma_radius_um * (1 - 1e-12) * heading[tips]
    radius[tips] = rng.uniform(0.6, 1.6, stems)
    kinds[tips] = BASAL
    if apical and stems:
        kinds[stems] = APICAL
    parent[tips] = 0
    stem = np.arange(points)
    n, wanted = stems + 1, max(2 * stems, points // 150)
    while n < points:
        tips = _next_tips(rng, tips, stem[tips], wanted)[: points - n]
        new = np.arange(n, n + len(tips))
        split = np.bincount(tips, minlength=points)[tips] > 1
        turn = np.where(split, 0.7, 0.2)[:, None]
        heading[new] = _unit(heading[tips] + turn * rng.normal(size=(len(tips), 3)))
        step = rng.lognormal(np.log(4.0), 0.5, len(tips))
        xyz[new] = xyz[tips] + step[:, None] * heading[new]
        shrink = np.where(split, rng.uniform(0.55, 0.9, len(tips)), rng.uniform(0.97, 1.0, len(tips)))
        radius[new] = np.maximum(radius[tips] * shrink, rng.uniform(0.1, 0.3, len(tips)))
        kinds[new], stem[new], parent[new] = kinds[tips], stem[tips], tips
        tips, n = new, n + len(tips)
    return _tree(kinds, xyz, radius, parent, f"random arbor of {points} points")


def _next_tips(rng: np.random.Generator, tips: Ints, stem: Ints, wanted: int) -> Ints:
    """The rows that get a child in this step, twice where they split: more splits while tips are few.

    The last tip of a stem never stops, so that no tree of the arbor dies out.
    """
    few = len(tips) < wanted
    alone = np.bincount(stem)[stem] == 1
    goes_on = tips[alone | (rng.uniform(size=len(tips)) > (0.005 if few else 0.05))]
    if not goes_on.size:
        goes_on = tips
    splits = goes_on[rng.uniform(size=len(goes_on)) < (0.12 if few else 0.05)]
    return np.sort(np.r_[goes_on, splits])


def _unit(vectors: Floats) -> Floats:
    return np.asarray(vectors / np.linalg.norm(vectors, axis=1, keepdims=True))
