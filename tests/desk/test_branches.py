"""The diagram of branches: nothing overlaps, heights are path distances, colours are values."""

from __future__ import annotations

from itertools import pairwise

import networkx as nx
import numpy as np
import pytest
from matplotlib.colors import to_rgb
from PIL import Image

from cable.desk.figures.branches import draw_branches, places
from cable.desk.figures.projection import bounds, directions, flat_xy
from cable.desk.figures.style import colour_map, scale_of, styled
from cable.desk.quantities import quantities
from cable.desk.scenario import load_scenario
from morphology import CellTree
from noise.cells import arbor
from tolerances import ROUND_OFF


@pytest.mark.parametrize("seed", [3, 8, 15])
def test_no_branch_covers_another_and_heights_are_path_distances(seed: int) -> None:
    tree = arbor(seed, 120)
    where = places(tree)
    assert np.array_equal(np.abs(where[:, 1]), tree.path_um)
    # vertical runs at one place across must not overlap; networkx tells the runs
    graph = nx.DiGraph([(int(p), row) for row, p in enumerate(tree.parent) if p >= 0])
    runs: dict[tuple[float, bool], list[tuple[float, float]]] = {}
    for parent, child in graph.edges:
        ends = sorted((where[parent, 1] if parent else 0.0, where[child, 1]))
        runs.setdefault((round(where[child, 0], 9), bool(where[child, 1] > 0)), []).append((ends[0], ends[1]))
    for found in runs.values():
        found.sort()
        assert all(above[0] >= below[1] - 1e-9 for below, above in pairwise(found))
    tips = [row for row in graph if graph.out_degree(row) == 0]
    for upward in (True, False):
        across = sorted(where[row, 0] for row in tips if (where[row, 1] > 0) == upward)
        assert np.allclose(np.diff(across), 1.0)
    apical = tree.kinds == 4
    assert (where[apical, 1] > 0).all() and (where[~apical, 1] <= 0).all()


def test_one_sort_of_dendrite_goes_up() -> None:
    stick = CellTree.from_text("1 1 0 0 0 8 -1\n2 3 0 8 0 1 1\n3 3 0 200 0 1 2\n")
    assert places(stick)[:, 1].tolist() == stick.path_um.tolist()
    assert places(CellTree.from_text("1 1 0 0 0 8 -1\n")).tolist() == [[0.0, 0.0]]


def test_colours_are_values(run, folder) -> None:
    assert run("map", "stick.toml", "--branches", "--quantity", "sd", "--out", "B.png").exit_code == 0
    field = load_scenario(folder / "stick.toml").fluctuations(1e-9)
    (quantity,) = quantities("sd", [], field.model.part_names)
    with styled():
        page = draw_branches(field, [quantity], "stick")
    axes = page.axes[0]
    picture = np.asarray(Image.open(folder / "B.png").convert("RGB"), dtype=float) / 255
    where, values = places(field.model.tree), quantity.values(field)
    norm, tip = scale_of(values), int(np.argmax(field.model.tree.path_um))
    parent = int(field.model.tree.parent[tip])
    for share in (0.15, 0.85):  # along the last cylinder, away from rings and names
        height = where[parent, 1] + share * (where[tip, 1] - where[parent, 1])
        value = values[parent] + share * (values[tip] - values[parent])
        x, y = axes.transData.transform((where[tip, 0], height))
        found = picture[round(picture.shape[0] - y), round(x)]
        assert np.abs(found - to_rgb(colour_map()(norm(value)))).max() < 0.05


def test_mistakes(run) -> None:
    said = run("map", "stick.toml", "--branches", "--plane", "xy", "--out", "B.png")
    assert said.exit_code == 2 and "--branches: the diagram lies in no plane" in said.stderr


def test_the_flattest_plane_of_all_is_found_however_the_cell_is_turned() -> None:
    rng = np.random.default_rng(5)
    turn, _ = np.linalg.qr(rng.normal(size=(3, 3)))
    tree = arbor(4, 60)
    flat = tree.xyz_um * [1.0, 1.0, 0.0]
    turned = CellTree(tree.ids, tree.kinds, flat @ turn.T, tree.radius_um, tree.parent)
    seen = flat_xy(turned, "flat")
    apart = [np.linalg.norm(p[:, None] - p[None, :], axis=-1) for p in (flat, seen)]
    assert np.allclose(*apart, atol=1e-9)
    axes = directions(turned, "flat")
    assert np.abs(axes @ axes.T - np.eye(3)).max() < ROUND_OFF and np.linalg.det(axes) > 0
    low, high = bounds(turned, "flat")
    assert (high - low > 50).all()
