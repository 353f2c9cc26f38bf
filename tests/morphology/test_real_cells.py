"""Real reconstructions: each is called usable or refused, with its oddities by their right names.

The files are listed in tests/data/LICENCES.md with their sources.
"""

from pathlib import Path

import numpy as np
import pytest

from morphology import CellTree, SwcError
from morphology.measures import measure
from morphology.swc import build_tree, read_swc, to_text

DATA = Path(__file__).parent.parent / "data"

# file, rows, usable as it stands, warnings and errors, notes
FILES = [
    ("astrocyte_kind7", 1222, True, {"glia", "no-soma"}, set()),
    ("bipolar_constant_radius", 773, True, {"constant-radius"}, {"soma-chain"}),
    (
        "ca1_interneuron_two_point_soma",
        2175,
        True,
        {"soma-tiny"},
        {"line-ends", "zero-length-edge", "radius-quantised", "soma-two-rows-one-place"},
    ),
    ("ca1_pyramidal", 7790, True, set(), {"radius-quantised"}),
    (
        "cortex_axon_from_dendrite",
        3964,
        True,
        set(),
        {"radius-quantised", "axon-from-dendrite", "soma-chain"},
    ),
    ("cortex_contour_soma", 10221, True, {"soma-outline", "spines-in-tree"}, {"radius-quantised"}),
    ("cortex_zero_axon_radii", 7963, False, {"zero-radius"}, {"radius-quantised", "soma-three-point"}),
    ("granule", 132, True, set(), {"soma-three-point"}),
    (
        "interneuron_negative_radii",
        5422,
        False,
        {"negative-radius"},
        {"radius-quantised", "soma-three-point", "point-inside-soma"},
    ),
    ("motoneuron", 4948, True, set(), set()),
    (
        "nonstandard_na",
        18,
        False,
        {"not-a-number", "self-parent", "unknown-kind", "no-soma"},
        {"child-before-parent"},
    ),
    ("purkinje", 4173, True, set(), {"soma-three-point"}),
    ("purkinje_zero_soma", 1382, False, {"zero-radius"}, {"zero-length-edge", "soma-two-rows-one-place"}),
    ("pyramidal_no_soma", 2608, True, {"no-soma", "radius-large", "mixed-kinds"}, set()),
    ("pyramidal_small", 403, True, set(), {"line-ends", "soma-three-point", "point-inside-soma"}),
]
USABLE = [f[0] for f in FILES if f[2]]


def read(name):
    return read_swc(DATA / f"{name}.swc")


def one(table, code):
    (finding,) = [f for f in table.findings if f.code == code]
    return finding


def test_every_file_of_the_folder_is_in_the_list():
    assert sorted(p.stem for p in DATA.glob("*.swc")) == sorted(f[0] for f in FILES)
    licences = (DATA / "LICENCES.md").read_text(encoding="utf-8")
    assert all(f"{f[0]}.swc" in licences for f in FILES)


@pytest.mark.parametrize(("name", "rows", "usable", "loud", "notes"), FILES, ids=[f[0] for f in FILES])
def test_what_is_found(name, rows, usable, loud, notes):
    table = read(name)
    assert len(table) == rows
    assert table.usable == usable
    assert {f.code for f in table.findings if f.severity != "note"} == loud
    assert {f.code for f in table.findings if f.severity == "note"} == notes


@pytest.mark.parametrize("name", USABLE)
def test_a_usable_cell_is_measured_and_written_and_read_again(name):
    tree = CellTree.from_file(DATA / f"{name}.swc")
    measures = measure(tree)
    assert measures.rows == len(tree)
    assert measures.length_um == pytest.approx(sum(b.length_um for b in measures.area_by_distance), rel=1e-12)
    assert measures.area_um2 == pytest.approx(sum(b.area_um2 for b in measures.area_by_distance), rel=1e-12)
    again = CellTree.from_text(to_text(tree))
    for field in ("ids", "kinds", "xyz_um", "radius_um", "parent"):
        np.testing.assert_array_equal(getattr(again, field), getattr(tree, field))


def test_axon_of_radius_zero_is_refused_and_usable_without_the_axon():
    table = read("cortex_zero_axon_radii")
    assert one(table, "zero-radius").message.startswith("2,772 axon rows of radius 0")
    with pytest.raises(SwcError, match=r"line 1930: 2,772 axon rows of radius 0.*omit = \[\"axon\"\]"):
        build_tree(table)
    tree, _ = build_tree(table, omit=["axon"])
    assert len(tree) == 7963 - 3450
    tree, findings = build_tree(table, repairs=["radius from neighbours"])
    assert len(tree) == 7963
    assert tree.radius_um[tree.kinds == 2].max() <= 0.69  # the thickest measured axon row, never the soma's
    assert any("2,772 rows" in f.message for f in findings if f.code == "repair-radius-from-neighbours")


def test_negative_radii_are_refused_and_counted():
    table = read("interneuron_negative_radii")
    finding = one(table, "negative-radius")
    assert finding.message.startswith("815 axon rows of negative radius")
    assert finding.line == 702
    assert len(build_tree(table, omit=["axon"])[0]) == 5422 - 4256


def test_a_soma_of_radius_zero_takes_its_twins_radius():
    table = read("purkinje_zero_soma")
    assert '"soma radius from its twin"' in one(table, "zero-radius").remedy
    with pytest.raises(SwcError, match="line 2: 1 soma row of radius 0"):
        build_tree(table)
    tree, _ = build_tree(table, repairs=["soma radius from its twin"])
    assert tree.radius_um[0] == 2.75
    assert tree.shape.sphere_area_um2.sum() == pytest.approx(4 * np.pi * 2.75**2)


def test_an_outline_becomes_a_sphere_of_about_its_size():
    tree, _ = build_tree(read("cortex_contour_soma"), repairs=["soma from outline"])
    assert (tree.kinds == 1).sum() == 1
    outline = read("cortex_contour_soma")
    across = np.ptp(outline.xyz_um[outline.kinds == 1], axis=0).max()
    assert 0.25 * across < tree.radius_um[tree.kinds == 1][0] < 0.6 * across
    assert tree.shape.soma_rule.startswith("one soma point")


def test_missing_numbers_are_refused_with_the_word_found():
    message = one(read("nonstandard_na"), "not-a-number").message
    assert "'NA' for its radius" in message
    assert "12 axon" in message
    with pytest.raises(SwcError, match="the root"):
        build_tree(read("nonstandard_na"), omit=["axon"])


def test_a_thick_root_of_a_cell_without_soma_is_named():
    finding = one(read("pyramidal_no_soma"), "radius-large")
    assert "32.85" in finding.message
    assert finding.line == 2
    assert "its row should be of kind 1" in finding.remedy


def test_lengths_of_a_published_motoneuron():
    # 25.6 mm of dendrite, as listed with the file's source (between centres; cable begins at the soma)
    tree = CellTree.from_file(DATA / "motoneuron.swc", omit=["axon"])
    assert measure(tree).length_um == pytest.approx(25_600, rel=0.01)
