"""Repairs change what they name and nothing else, and say by how much."""

import math

import numpy as np
import pytest

from morphology import SwcError
from morphology.repair import REPAIRS
from morphology.swc import build_tree, read_swc_text


def repaired(text, name):
    table, note = REPAIRS[name](read_swc_text(text))
    assert note.severity == "note"
    assert note.code == "repair-" + name.replace(" ", "-")
    return table, note


def test_radius_is_interpolated_along_the_tree_between_rows_of_its_kind():
    text = """1 1 0 0 0 8 -1
2 3 10 0 0 2 1
3 3 20 0 0 0 2
4 3 50 0 0 -1 3
5 3 50 10 0 1 4
6 3 70 0 0 NA 4
"""
    table, note = repaired(text, "radius from neighbours")
    # 2 at the start, 1 after 50 µm: 2 - 10/50 and 2 - 40/50; row 6 takes that of the row above
    np.testing.assert_allclose(table.radius_um, [8, 2, 1.8, 1.2, 1, 2], rtol=1e-14)
    assert "3 rows" in note.message
    assert "length +0 %" in note.message
    assert table.usable


@pytest.mark.parametrize("ends", [("13 0", "10 20"), ("10 20", "13 0")])
def test_the_nearest_good_row_below_counts(ends):
    radius = {"13 0": 0.5, "10 20": 3}
    text = "1 1 0 0 0 8 -1\n2 3 10 0 0 0 1\n"
    text += "".join(f"{i} 3 {at} 0 {radius[at]} 2\n" for i, at in enumerate(ends, 3))
    assert repaired(text, "radius from neighbours")[0].radius_um[1] == 0.5


def test_a_neurite_never_takes_the_somas_radius():
    table, note = repaired("1 1 0 0 0 8 -1\n2 3 10 0 0 0 1\n3 3 30 0 0 0 2\n", "radius from neighbours")
    assert table.radius_um.tolist() == [8, 0, 0]
    assert "nothing was changed" in note.message
    with pytest.raises(SwcError, match="2 basal rows of radius 0"):
        build_tree(table)


def test_rows_in_any_order_are_repaired_alike():
    lines = ["1 1 0 0 0 8 -1", "2 3 10 0 0 2 1", "3 3 20 0 0 0 2", "4 3 40 0 0 1 3"]
    forward = repaired("\n".join(lines) + "\n", "radius from neighbours")[0]
    backward = repaired("\n".join(lines[::-1]) + "\n", "radius from neighbours")[0]
    np.testing.assert_array_equal(forward.radius_um, backward.radius_um[::-1])


def circle(angles, pen=0.2, extra=""):
    rows = [
        f"{i + 1} 1 {1 + 8 * math.cos(a)!r} {2 + 8 * math.sin(a)!r} 3 {pen} {i or -1}" for i, a in enumerate(angles)
    ]
    n = len(rows)
    return "\n".join([*rows, f"{n + 1} 3 30 2 3 0.7 {n // 2}", f"{n + 2} 3 60 2 3 0.7 {n + 1}", extra])


@pytest.mark.parametrize("uneven", [False, True])
def test_a_circle_becomes_the_sphere_of_its_radius_however_it_is_sampled(uneven):
    angles = [2 * math.pi * (k / 60) for k in range(60)]
    if uneven:
        angles = angles[:30] + [math.pi + math.pi * k / 150 for k in range(150)]
    table, note = repaired(circle(angles), "soma from outline")
    soma = table.kinds == 1
    assert soma.sum() == 1
    np.testing.assert_allclose(table.xyz_um[soma][0], [1, 2, 3], atol=0.02)
    assert table.radius_um[soma][0] == pytest.approx(math.hypot(8, 0.2), rel=2e-3)
    assert "one sphere of radius 8.0" in note.message
    tree, _ = build_tree(table)
    assert tree.parent.tolist() == [-1, 0, 1]


def test_a_stack_of_discs_becomes_a_sphere():
    # the discs of a ball of radius 10, every µm: the rims all lie 10 from the middle
    heights = [k - 9 for k in range(19)]
    rows = [f"{i + 1} 1 0 0 {z} {math.sqrt(100 - z * z)!r} {i or -1}" for i, z in enumerate(heights)]
    table, _ = repaired("\n".join([*rows, "20 3 30 0 0 1 10", "21 3 60 0 0 1 20"]), "soma from outline")
    np.testing.assert_allclose(table.xyz_um[0], [0, 0, 0], atol=1e-12)
    assert table.radius_um[0] == pytest.approx(10.0, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "why"),
    [
        ("1 1 0 0 0 8 -1\n2 1 0 8 0 8 1\n3 1 0 -8 0 8 1\n4 3 30 0 0 1 1\n", "neither an outline"),
        ("1 1 0 0 0 8 -1\n2 3 30 0 0 1 1\n", "neither an outline"),
        (circle([2 * math.pi * k / 12 for k in range(12)], extra="20 1 90 2 3 1 14"), "do not touch"),
    ],
)
def test_a_soma_that_is_no_outline_is_left_alone(text, why):
    before = read_swc_text(text)
    after, note = REPAIRS["soma from outline"](before)
    assert after is before
    assert why in note.message


def test_the_largest_piece_is_kept():
    text = "1 3 0 0 0 1 -1\n2 1 9 9 9 8 -1\n3 3 40 0 0 1 2\n4 3 60 0 0 1 3\n5 3 5 0 0 1 1\n"
    table, note = repaired(text, "keep largest piece")
    assert table.ids.tolist() == [2, 3, 4]
    assert "2 rows" in note.message
    assert table.usable


def test_a_row_in_its_parents_place_is_merged_if_it_is_the_same():
    text = """1 1 0 0 0 8 -1
2 3 10 0 0 1 1
3 3 10 0 0 1 2
4 3 10 0 0 1 3
5 3 30 0 0 1 4
6 3 30 0 0 0.5 5
7 3 50 0 0 0.5 6
"""
    table, note = repaired(text, "drop zero-length edges")
    assert table.ids.tolist() == [1, 2, 5, 6, 7]  # 6 is a step of the radius and stays
    assert table.parent_ids.tolist() == [-1, 1, 2, 5, 6]
    assert "2 rows" in note.message
    before, after = build_tree(read_swc_text(text))[0], build_tree(table)[0]
    assert after.shape.area_um2.sum() == pytest.approx(before.shape.area_um2.sum(), rel=1e-14)


def test_side_twigs_go_and_true_ends_stay():
    text = """1 1 0 0 0 8 -1
2 3 10 0 0 1 1
3 3 20 0 0 1 2
4 3 20 1.4 0 0.2 3
5 3 30 0 0 1 3
6 3 30 5 0 0.2 5
7 3 31 0 0 1 5
8 2 0 -10 0 0.5 1
9 2 0 -20 0 0.5 8
10 2 1 -20 0 0.2 9
11 2 0 -40 0 0.5 9
"""
    table, note = repaired(text, "remove side twigs")
    # 4 is a twig; 6 is long, 7 ends a dendrite beside another end, 10 is on an axon
    assert table.ids.tolist() == [1, 2, 3, 5, 6, 7, 8, 9, 10, 11]
    assert "1 row changed" in note.message
    area = 100 * math.pi * 1.2 * math.hypot(1.4, 0.8) / _cable_and_soma(text)
    assert f"area -{area:.3g} %" in note.message


def _cable_and_soma(text):
    """Area by the naive loop: frusta, a neurite leaving the soma's centre with its own radius, one sphere."""
    rows = [list(map(float, line.split())) for line in text.strip().split("\n")]
    at = {row[0]: row for row in rows}
    area = 4 * math.pi * 8**2
    for _, _, *place, radius, parent in rows[1:]:
        up = at[parent]
        above = radius if up[1] == 1 else up[5]
        area += math.pi * (radius + above) * math.hypot(math.dist(place, up[2:5]), radius - above)
    return area


def test_repairs_are_done_in_the_order_named_and_reported():
    text = "1 1 0 0 0 0 -1\n2 1 0 0 0 8 1\n3 3 10 0 0 1 1\n4 3 30 0 0 0 3\n5 3 90 0 0 1 -1\n"
    names = ["keep largest piece", "radius from neighbours", "soma radius from its twin"]
    tree, findings = build_tree(read_swc_text(text), repairs=names)
    assert tree.radius_um.tolist() == [8, 8, 1, 1]
    said = [f.code for f in findings if f.code.startswith("repair-")]
    assert said == ["repair-" + name.replace(" ", "-") for name in names]
    with pytest.raises(SwcError, match="negative|radius 0"):
        build_tree(read_swc_text(text), repairs=names[:1])


def test_an_unknown_repair_is_answered_with_the_known_ones():
    with pytest.raises(SwcError, match='no repair \'grow\'.*"radius from neighbours".*"keep largest piece"'):
        build_tree(read_swc_text("1 1 0 0 0 8 -1\n"), repairs=["grow"])


def test_broken_links_are_not_repaired():
    with pytest.raises(SwcError, match="line 2: 1 row has a parent that is not in the file"):
        build_tree(read_swc_text("1 1 0 0 0 8 -1\n2 3 9 0 0 0 7\n"), repairs=["radius from neighbours"])


def test_a_repair_leaves_its_input_alone():
    table = read_swc_text("1 1 0 0 0 8 -1\n2 3 10 0 0 1 1\n3 3 30 0 0 0 2\n4 3 30.5 1 0 0.2 2\n")
    held = [a.copy() for a in (table.ids, table.xyz_um, table.radius_um, table.parent_ids)]
    for repair in REPAIRS.values():
        repair(table)
    for now, then in zip((table.ids, table.xyz_um, table.radius_um, table.parent_ids), held, strict=True):
        np.testing.assert_array_equal(now, then)
