"""An invented pyramidal neuron: basal trees, an apical trunk with obliques and a tuft, an axon stub.

Sizes are typical of such cells in rodent cortex (common practice, no source); no real cell was traced.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from morphology.kinds import APICAL, AXON, BASAL, SOMA
from morphology.structure import Floats
from morphology.tree import CellTree

STEP_UM = 5.5
UP = np.array([0.0, 1.0, 0.0])
FLATNESS = 0.35  # how much of the wandering goes into depth (z)
THINNEST_UM = 0.2


@dataclass
class _Sketch:
    """Rows under construction; places and radii rounded to a nanometre, as a file would have them."""

    rng: np.random.Generator
    kinds: list[int] = field(default_factory=list)
    places: list[Floats] = field(default_factory=list)
    radii: list[float] = field(default_factory=list)
    parents: list[int] = field(default_factory=list)
    headings: list[Floats] = field(default_factory=list)

    def add(self, kind: int, place: Floats, radius_um: float, parent: int, heading: Floats) -> int:
        self.kinds.append(kind)
        self.places.append(np.round(place, 3))
        self.radii.append(round(float(radius_um), 3))
        self.parents.append(parent)
        self.headings.append(heading)
        return len(self.kinds) - 1

    def grow(
        self,
        kind: int,
        row: int,
        heading: Floats,
        length_um: float,
        radii_um: tuple[float, float],
        wander: float = 0.12,
        pull: Floats | None = None,
    ) -> list[int]:
        """A gently winding path from `row`, its radius going from the first to the second of `radii_um`.

        `pull` is a direction into which the path turns slowly. Returns the rows of the path.
        """
        n = max(2, round(length_um / STEP_UM))
        rows = []
        place = self.places[row]
        sway = np.zeros(3)
        for k in range(1, n + 1):
            # the sway has a memory of some steps, so that the path bends rather than jitters
            sway = 0.75 * sway + wander * self.rng.normal(size=3) * (1.0, 1.0, FLATNESS)
            heading = _unit(heading + 0.35 * sway + (0.0 if pull is None else pull))
            place = place + heading * length_um / n * self.rng.uniform(0.8, 1.2)
            share = k / n
            radius = radii_um[0] + (radii_um[1] - radii_um[0]) * share
            row = self.add(kind, place, max(radius * self.rng.uniform(0.94, 1.06), THINNEST_UM), row, heading)
            rows.append(row)
        return rows

    def turned(self, heading: Floats, degrees: float) -> Floats:
        """`heading` turned in the plane of the drawing by an angle, with a little depth."""
        angle = np.radians(degrees)
        cos, sin = np.cos(angle), np.sin(angle)
        x, y, z = heading
        depth = 0.7 * z + FLATNESS * self.rng.normal() * 0.5
        return _unit(np.array([cos * x - sin * y, sin * x + cos * y, depth]))

    def fork(
        self,
        kind: int,
        row: int,
        radius_um: float,
        orders: int,
        lengths_um: tuple[float, float],
        spread_degrees: float,
        pull: Floats | None = None,
    ) -> None:
        """A bush of up to `orders` bifurcations on `row`; `lengths_um` before the last fork and after it."""
        rng = self.rng
        waiting = [(row, radius_um, orders)]
        while waiting:
            base, radius, left = waiting.pop()
            share = rng.uniform(0.35, 0.65)
            side = rng.choice((-1.0, 1.0))
            for part, sign in ((share, side), (1.0 - share, -side)):
                start = max(radius * (1.1 * part) ** (2 / 3), THINNEST_UM)
                last = left <= 1 or (left < orders and rng.uniform() < 0.2)
                length = lengths_um[1 if last else 0] * rng.uniform(0.7, 1.35)
                end = max(start * (0.6 if last else 0.9), THINNEST_UM)
                heading = self.turned(self.headings[base], sign * spread_degrees * rng.uniform(0.6, 1.3))
                tip = self.grow(kind, base, heading, length, (start, end), pull=pull)[-1]
                if not last:
                    waiting.append((tip, end, left - 1))


def neuron(seed: int | np.random.Generator) -> CellTree:
    """An invented pyramidal cell, apical dendrite up (+y), flat in the main; another one for every seed.

    About 800 to 1,500 points, 10,000 to 25,000 µm² of membrane; soma of about 8 µm radius at the origin.
    """
    sketch = _Sketch(np.random.default_rng(seed))
    soma_radius = sketch.rng.uniform(7.4, 8.6)
    sketch.add(SOMA, np.zeros(3), soma_radius, -1, UP)
    trees = int(sketch.rng.integers(5, 7))
    sides = np.linspace(168, 372, trees) + sketch.rng.uniform(-10, 10, trees)
    _axon(sketch, soma_radius, float(sides[trees // 2 - 1 : trees // 2 + 1].mean()))
    for degrees in sides:
        _basal(sketch, soma_radius, degrees)
    _apical(sketch, soma_radius)
    n = len(sketch.kinds)
    return CellTree(
        np.arange(1, n + 1),
        np.array(sketch.kinds),
        np.array(sketch.places),
        np.array(sketch.radii),
        np.array(sketch.parents),
        "invented pyramidal cell",
    )


def _stem(sketch: _Sketch, kind: int, degrees: float, radius_um: float, soma_radius_um: float) -> int:
    """A first row just off the soma's surface, at an angle counted from +x in the plane of the drawing."""
    heading = sketch.turned(np.array([1.0, 0.0, 0.0]), degrees)
    return sketch.add(kind, heading * (soma_radius_um + 0.5), radius_um, 0, heading)


def _axon(sketch: _Sketch, soma_radius_um: float, degrees: float) -> None:
    row = _stem(sketch, AXON, degrees, 0.9, soma_radius_um)
    row = sketch.grow(AXON, row, sketch.headings[row], 15.0, (0.8, 0.45), wander=0.05)[-1]
    sketch.grow(AXON, row, sketch.headings[row], 45.0, (0.45, 0.4), wander=0.05, pull=-0.04 * UP)


def _basal(sketch: _Sketch, soma_radius_um: float, degrees: float) -> None:
    rng = sketch.rng
    radius = rng.uniform(0.75, 1.05)
    row = _stem(sketch, BASAL, degrees, radius * 1.15, soma_radius_um)
    row = sketch.grow(BASAL, row, sketch.headings[row], rng.uniform(14, 36), (radius, radius * 0.9))[-1]
    outward = 0.02 * _unit(sketch.places[row])
    sketch.fork(BASAL, row, radius * 0.9, int(rng.integers(2, 4)), (38.0, 95.0), 32.0, outward)


def _apical(sketch: _Sketch, soma_radius_um: float) -> None:
    rng = sketch.rng
    length, base, end = rng.uniform(400, 580), rng.uniform(1.7, 2.2), rng.uniform(0.8, 1.0)
    row = _stem(sketch, APICAL, 90 + rng.uniform(-6, 6), base * 1.25, soma_radius_um)
    trunk = sketch.grow(APICAL, row, sketch.headings[row], length, (base, end), wander=0.06, pull=0.04 * UP)
    obliques = int(rng.integers(6, 10))
    side = rng.choice((-1.0, 1.0))
    for k, share in enumerate(np.linspace(0.1, 0.68, obliques) + rng.uniform(-0.025, 0.025, obliques)):
        at = trunk[int(share * len(trunk))]
        radius = rng.uniform(0.42, 0.62)
        turn = (side if k % 2 else -side) * rng.uniform(52, 78)
        heading = sketch.turned(sketch.headings[at], turn)
        reach = rng.uniform(30, 60)
        if rng.uniform() < 0.55:
            tip = sketch.grow(APICAL, at, heading, reach, (radius, radius * 0.9), pull=0.012 * UP)[-1]
            sketch.fork(APICAL, tip, radius * 0.9, 1, (40.0, 85.0), 28.0, 0.012 * UP)
        else:
            sketch.grow(APICAL, at, heading, reach + 80.0, (radius, radius * 0.55), pull=0.012 * UP)
    sketch.fork(APICAL, trunk[-1], end, 3, (42.0, 95.0), 30.0, 0.015 * UP)


def _unit(vector: Floats) -> Floats:
    return vector / np.linalg.norm(vector)
