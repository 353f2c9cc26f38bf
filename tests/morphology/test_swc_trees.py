"""From SWC rows to a tree and back: omission, shrinkage, round trips, long files, and any bytes at all."""

import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from morphology import CellTree, SwcError
from morphology.growth import random_arbor, sphere
from morphology.repair import REPAIRS
from morphology.swc import build_tree, read_swc, read_swc_text, to_text, write_swc
from swc_texts import CELL, changed, long_dendrite


def test_omitting_a_kind_takes_along_what_hangs_on_it_and_says_so():
    text = CELL + "9 3 0 -80 0 0.5 8\n10 3 0 -110 0 0.5 9\n"
    tree, findings = build_tree(read_swc_text(text), omit=["axon"])
    assert tree.ids.tolist() == [1, 2, 3, 4, 5, 6]
    (lost,) = [f for f in findings if f.code == "kept-kind-left-out"]
    assert lost.severity == "warning"
    assert lost.line == 10
    assert "2 basal rows" in lost.message
    assert f"{np.hypot(30, 1) + 30:.4g} µm" in lost.message


@pytest.mark.parametrize("omit", [["axon"], [2], ["2"], "axon", ["AXON"]])
def test_kinds_are_omitted_by_word_or_number(omit):
    broken = changed(9, "8 2 0 -50 1 0 7")
    assert build_tree(read_swc_text(broken), omit=omit)[0].ids.tolist() == [1, 2, 3, 4, 5, 6]


def test_a_root_or_an_unknown_kind_cannot_be_omitted():
    with pytest.raises(SwcError, match="line 2: the root"):
        build_tree(read_swc_text(CELL), omit=["soma"])
    with pytest.raises(SwcError, match='unknown kind.*"apical"'):
        build_tree(read_swc_text(CELL), omit=["axn"])


def test_a_second_root_of_an_omitted_kind_does_not_matter():
    loose = CELL + "9 2 300 300 0 0 -1\n"
    assert not read_swc_text(loose).usable
    assert build_tree(read_swc_text(loose), omit=["axon"])[0].ids.tolist() == [1, 2, 3, 4, 5, 6]


def test_shrinkage_scales_places_and_not_radii():
    table = read_swc_text(CELL)
    tree, findings = build_tree(table, shrinkage=(1.25, 2.0))
    np.testing.assert_allclose(tree.xyz_um[3], [100.0, 12.5, 4.0], rtol=1e-15)
    assert tree.radius_um[3] == 0.6
    assert "shrinkage" in {f.code for f in findings}
    np.testing.assert_array_equal(table.xyz_um[3], [80.0, 10.0, 2.0])
    with pytest.raises(SwcError, match="two positive numbers"):
        build_tree(table, shrinkage=(1.0, 0.0))


def test_write_and_read_again_is_the_same_tree(tmp_path):
    tree = random_arbor(5, 700).rerooted(200)
    path = tmp_path / "arbor.swc"
    write_swc(tree, path)
    again = CellTree.from_file(path)
    for field in ("ids", "kinds", "xyz_um", "radius_um", "parent"):
        np.testing.assert_array_equal(getattr(again, field), getattr(tree, field))
    assert [p.name for p in tmp_path.iterdir()] == ["arbor.swc"]


def test_writing_into_a_missing_folder_leaves_nothing(tmp_path):
    with pytest.raises(OSError, match="nowhere"):
        write_swc(sphere(8.0), tmp_path / "nowhere" / "cell.swc")
    assert list(tmp_path.iterdir()) == []


def test_a_name_with_a_line_end_stays_in_its_comment():
    tree = CellTree([1], [1], [[0, 0, 0]], [8.0], [-1], name="odd\n2 3 0 0 0 1 1")
    assert len(read_swc_text(to_text(tree))) == 1


def test_ten_thousand_rows_in_one_chain_backwards_need_no_recursion():
    text = "\n".join(reversed(long_dendrite(10_000).split("\n")))
    tree = build_tree(read_swc_text(text))[0]
    assert tree.ids.tolist() == list(range(1, 10_002))
    assert tree.path_um[-1] == pytest.approx(50_008.0, rel=1e-12)


def test_a_circle_of_ten_thousand_rows_is_named_in_short():
    lines = long_dendrite(10_000).split("\n")
    lines[0] = "1 1 0 0 0 8 10001"
    (cycle,) = [f for f in read_swc_text("\n".join(lines)).findings if f.code == "cycle"]
    assert "10001 rows" in cycle.message
    assert len(cycle.message) < 150


def test_a_large_file_is_read_in_reasonable_time():
    rng = np.random.default_rng(3)
    n = 100_000
    place = rng.uniform(-300, 300, (n, 3))
    parent = rng.integers(np.maximum(np.arange(n) - 40, 0), np.maximum(np.arange(n), 1)) + 1
    rows = [f"{i + 1} 3 {x:.3f} {y:.3f} {z:.3f} 0.5 {parent[i]}" for i, (x, y, z) in enumerate(place.tolist())]
    rows[0] = "1 1 0 0 0 8 -1"
    for text in ("\n".join(rows), "\n".join(rows).replace(" ", ","), "\n".join(reversed(rows))):
        start = time.perf_counter()
        table = read_swc(text.encode())
        assert table.usable
        assert len(build_tree(table)[0]) == n
        assert time.perf_counter() - start < 5.0  # about 0.2 s; the margin is for a loaded machine


# --- whatever the bytes are


@settings(deadline=None, max_examples=150)
@given(st.binary(max_size=400))
def test_bytes_never_raise_anything_but_a_refusal(data):
    table = read_swc(data)
    if table.usable:
        assert len(build_tree(table)[0]) >= 1
    else:
        with pytest.raises(SwcError):
            build_tree(table)


TOKENS = st.sampled_from(
    [
        "-1",
        "0",
        "1",
        "2",
        "3",
        "4",
        "7",
        "9",
        "NA",
        "nan",
        "inf",
        "-inf",
        "1e308",
        "0.5",
        "-3",
        "1e-320",
        ",",
        "#",
        "x",
        "\t",
    ]
)


@settings(deadline=None, max_examples=250)
@given(
    st.lists(st.tuples(st.integers(0, 8), st.integers(0, 6), TOKENS), max_size=6),
    st.sampled_from(["\n", "\r\n", "\r"]),
    st.lists(st.sampled_from(sorted(REPAIRS)), max_size=3),
    st.lists(st.sampled_from(["axon", "basal", "apical", "soma", 7]), max_size=2),
)
def test_mutated_text_gives_a_sound_tree_or_a_refusal(mutations, line_end, repairs, omit):
    lines = [line.split(" ") for line in CELL.strip().split("\n")]
    for line, column, token in mutations:
        row = lines[min(line, len(lines) - 1)]
        row[min(column, len(row) - 1)] = token
    text = line_end.join(" ".join(row) for row in lines)
    table = read_swc_text(text)
    assert len({f.code for f in table.findings}) == len(table.findings)
    try:
        tree, findings = build_tree(table, omit=omit, repairs=repairs)
    except SwcError as refused:
        assert any(f.severity == "error" for f in refused.findings)
        assert str(refused)
    else:
        assert all(f.severity != "error" for f in findings)
        assert np.isfinite(tree.shape.area_um2).all()
