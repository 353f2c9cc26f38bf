"""Reading SWC text: every oddity is one finding with its line and a remedy; clean text round-trips."""

import math
import pickle
import time

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from morphology import CellTree, Finding, SwcError
from morphology.growth import random_arbor, sphere
from morphology.repair import REPAIRS
from morphology.swc import build_tree, read_swc, read_swc_text, to_text, write_swc

CELL = """\
# an invented cell
1 1 0 0 0 8 -1
2 3 9 0 0 1 1
3 3 40 3 0 0.9 2
4 3 80 10 2 0.6 3
5 4 0 9 0 1.5 1
6 4 2 60 0 1.2 5
7 2 0 -9 0 0.5 1
8 2 0 -50 1 0.4 7
"""


def changed(line: int, new: str) -> str:
    """CELL with one line (from 1) replaced."""
    lines = CELL.split("\n")
    lines[line - 1] = new
    return "\n".join(lines)


def codes(text: str | bytes) -> set[str]:
    source = read_swc_text(text) if isinstance(text, str) else read_swc(text)
    return {f.code for f in source.findings}


def long_dendrite(rows: int, radius: str = "0.5", step: float = 5.0, kind: int = 3) -> str:
    lines = ["1 1 0 0 0 8 -1"]
    lines += [f"{i} {kind} {8 + step * (i - 1)} 0 0 {radius} {i - 1}" for i in range(2, rows + 2)]
    return "\n".join(lines)


def two_radii(rows: int) -> str:
    lines = long_dendrite(rows).split("\n")
    return "\n".join(line.replace(" 0.5 ", " 0.6 ") if n % 2 else line for n, line in enumerate(lines))


def ring(rows: int, pen: float = 0.2) -> str:
    """A soma drawn as a circle of radius 8 around (1, 2, 3), a dendrite on its first row."""
    angle = 2 * np.pi * np.arange(rows) / rows
    lines = [
        f"{i + 1} 1 {1 + 8 * math.cos(a)!r} {2 + 8 * math.sin(a)!r} 3 {pen} {i or -1}"
        for i, a in enumerate(angle.tolist())
    ]
    return "\n".join([*lines, f"{rows + 1} 3 30 2 3 0.7 1", f"{rows + 2} 3 60 2 3 0.7 {rows + 1}"])


def twiggy(twigs: int) -> str:
    """A dendrite with a one-row twig of 1.35 µm on every second row."""
    lines = [long_dendrite(2 * twigs + 2)]
    n = 2 * twigs + 4
    for k in range(twigs):
        row = 2 * k + 3
        lines.append(f"{n + k} 3 {8 + 5 * (row - 1)} 1.35 0 0.2 {row}")
    return "\n".join(lines)


def star(children: int) -> str:
    arms = [f"{i + 4} 3 {30 + i} 30 {i} 0.5 3" for i in range(children)]
    return "\n".join(["1 1 0 0 0 8 -1", "2 3 9 0 0 1 1", "3 3 30 0 0 1 2", *arms])


ODD = [
    # code, severity, line, a word of the message, a word of the remedy, text
    ("empty", "error", None, "empty", "seven columns", ""),
    ("empty", "error", None, "no row", "seven columns", "# a comment only\n\n"),
    ("not-text", "error", 3, "not text", "SWC file", "1 1 0 0 0 1 -1\n\n\x00\x01\n"),
    ("column-count", "error", 4, "line 4 has 6", "id kind x y z radius parent", changed(4, "3 3 40 3 0 0.9")),
    ("column-count", "error", 2, "line 2 has 13", "seven", changed(2, "1 1 0 0 0 8 -12 3 9 0 0 1 1")),
    ("extra-columns", "warning", 1, "8 columns", "first seven", "1 1 0 0 0 8 -1 99\n2 3 20 0 0 1 1 99\n"),
    ("decimal-comma", "error", 3, "decimal comma", "decimal points", changed(3, "2 3 9,5 0 0 1 1")),
    (
        "not-a-number",
        "error",
        4,
        "'NA' for its radius",
        "radius from neighbours",
        changed(4, "3 3 40 3 0 NA 2"),
    ),
    ("not-a-number", "error", 4, "'NA' for its z", 'omit = ["basal"]', changed(4, "3 3 40 3 NA 1 2")),
    ("not-a-number", "error", 1, "'id'", "comment begins with #", changed(1, "id kind x y z radius parent")),
    ("not-a-number", "error", 4, "1_0", "correct", changed(4, "3 3 1_0 3 0 1 2")),
    ("not-whole", "error", 4, "'3.5'", "whole numbers", changed(4, "3.5 3 40 3 0 0.9 2")),
    ("not-whole", "error", 4, "'1e300'", "whole numbers", changed(4, "1e300 3 40 3 0 0.9 2")),
    ("not-finite", "error", 4, "1 basal row", "correct", changed(4, "3 3 inf 3 0 0.9 2")),
    ("not-finite", "error", 4, "1 basal row", "radius from neighbours", changed(4, "3 3 40 3 0 nan 2")),
    ("zero-radius", "error", 9, "1 axon row of radius 0", 'omit = ["axon"]', changed(9, "8 2 0 -50 1 0 7")),
    ("zero-radius", "error", 2, "1 soma row", "nothing in the file", changed(2, "1 1 0 0 0 0 -1")),
    ("negative-radius", "error", 9, "negative", "radius from neighbours", changed(9, "8 2 0 -50 1 -0.4 7")),
    ("duplicate-id", "error", 5, "(ids 3)", "id of its own", changed(5, "3 3 80 10 2 0.6 3")),
    ("negative-id", "error", 9, "(ids -8)", "from 0 or 1", changed(9, "-8 2 0 -50 1 0.4 7")),
    ("missing-parent", "error", 4, "parents 77", "-1", changed(4, "3 3 40 3 0 0.9 77")),
    ("self-parent", "error", 4, "own parent", "-1", changed(4, "3 3 40 3 0 0.9 3")),
    ("cycle", "error", 3, "circle: 2 -> 4 -> 3 -> 2", "root", changed(3, "2 3 9 0 0 1 4")),
    ("no-root", "error", None, "no parent is negative", "-1", changed(2, "1 1 0 0 0 8 8")),
    (
        "several-roots",
        "error",
        6,
        "2 unconnected pieces (6, 2 rows",
        "keep largest piece",
        changed(6, "5 4 0 9 0 1 -1"),
    ),
    ("child-before-parent", "note", 2, "(ids 3)", "put in order", "# rows\n3 3 40 0 0 1 1\n1 1 0 0 0 8 -1\n"),
    ("unknown-kind", "warning", 5, "12", "number of the kind", changed(5, "4 12 80 10 2 0.6 3")),
    ("unknown-kind", "note", 5, "5 and 6 mark fork", "number of the kind", changed(5, "4 6 80 10 2 0.6 3")),
    ("all-kinds-0", "warning", 1, "kind 0", "3 basal", "1 0 0 0 0 8 -1\n2 0 20 0 0 1 1\n"),
    ("glia", "warning", 1, "glia", "glial", "1 7 0 0 0 8 -1\n2 7 20 0 0 1 1\n"),
    ("no-dendrite", "warning", 2, "called axon", "wrong kind", "1 1 0 0 0 8 -1\n2 2 20 0 0 1 1\n"),
    ("zero-length-edge", "note", 4, "(ids 3)", "one electrical point", changed(4, "3 3 9 0 0 0.9 2")),
    ("point-inside-soma", "note", 3, "(ids 2)", "surface", changed(3, "2 3 4 0 0 1 1")),
    ("no-soma", "warning", None, "no soma", "root", "1 3 0 0 0 2 -1\n2 3 20 0 0 1 1\n"),
    ("soma-outline", "warning", 1, "30 soma rows", "soma from outline", ring(30)),
    (
        "soma-chain",
        "note",
        1,
        "3 rows",
        "frusta",
        "1 1 0 0 0 3 -1\n2 1 4 0 0 5 1\n3 1 8 0 0 3 2\n4 3 20 0 0 1 3\n",
    ),
    ("soma-two-rows-one-place", "note", 1, "(ids 1, 2)", "one sphere", "1 1 0 0 0 8 -1\n2 1 0 0 0 8 1\n"),
    (
        "soma-three-point",
        "note",
        1,
        "(ids 1, 2, 3)",
        "no cable",
        "1 1 0 0 0 8 -1\n2 1 0 8 0 8 1\n3 1 0 -8 0 8 1\n",
    ),
    ("soma-in-parts", "warning", 2, "2 parts", "stray", changed(9, "8 1 0 -50 1 0.4 7")),
    ("soma-tiny", "warning", 2, "0.5 µm", "measured size", changed(2, "1 1 0 0 0 0.5 -1")),
    ("constant-radius", "warning", 2, "not measured", "not trust", long_dendrite(12)),
    ("radius-quantised", "note", 2, "2 values", "one step", two_radii(60)),
    ("radius-large", "warning", 4, "up to 33 (ids 3)", "kind 1", changed(4, "3 3 40 3 0 33 2")),
    ("radius-codes", "warning", 2, "codes", "sixth column", long_dendrite(3, "390")),
    ("units", "warning", None, "mm across", "nanometres", long_dendrite(12, step=5000.0)),
    ("units", "warning", None, "a coordinate is 1e+06", "Check the unit", changed(4, "3 3 1e6 3 0 0.9 2")),
    (
        "units",
        "warning",
        None,
        "µm across",
        "millimetres",
        long_dendrite(60, step=0.01).replace(" 8.", " 0."),
    ),
    ("spines-in-tree", "warning", 44, "20 of 21 tips", "remove side twigs", twiggy(20)),
    ("many-children", "note", 3, "up to 9 children (ids 3)", "soma", star(9)),
    ("axon-from-dendrite", "note", 9, "(ids 8)", "Nothing to do", changed(9, "8 2 0 -50 1 0.4 2")),
    ("mixed-kinds", "warning", 5, "1 apical row", "zones", changed(5, "4 4 80 10 2 0.6 3")),
    ("line-ends", "note", None, "CR LF throughout", "Nothing", CELL.replace("\n", "\r\n")),
    ("line-ends", "note", None, "CR CR LF", "Nothing", CELL.replace("\n", "\r\r\n")),
    ("line-ends", "note", None, "are CR", "Nothing", CELL.replace("\n", "\r")),
]


@pytest.mark.parametrize(("code", "severity", "line", "word", "remedy", "text"), ODD, ids=[c[0] for c in ODD])
def test_each_oddity_is_one_finding_with_line_and_remedy(code, severity, line, word, remedy, text):
    table = read_swc_text(text, name="odd.swc")
    found = [f for f in table.findings if f.code == code]
    assert len(found) == 1
    assert (found[0].severity, found[0].line) == (severity, line)
    assert word in found[0].message
    assert remedy in found[0].remedy
    assert table.usable == all(f.severity != "error" for f in table.findings)
    if severity == "error":
        with pytest.raises(SwcError, match="odd.swc") as refused:
            build_tree(table)
        assert code in {f.code for f in refused.value.findings}


def test_a_clean_cell_has_no_finding():
    assert read_swc_text(CELL).findings == ()


ENCODED = [
    ("utf-8", CELL.encode(), set()),
    ("utf-8 with mark", b"\xef\xbb\xbf" + CELL.encode(), {"bom"}),
    ("utf-16", CELL.encode("utf-16"), {"bom"}),
    (
        "latin-1 header",
        CELL.replace("invented", "erfundene Zelle, 20 \xb5m, M\xfcller").encode("latin-1"),
        {"latin-1"},
    ),
    ("crlf", CELL.replace("\n", "\r\n").encode(), {"line-ends"}),
    ("cr cr lf", CELL.replace("\n", "\r\r\n").encode(), {"line-ends"}),
    ("cr", CELL.replace("\n", "\r").encode(), {"line-ends"}),
    ("tabs", CELL.replace(" ", "\t").replace("#\t", "# ").encode(), set()),
    ("commas", CELL.replace(" ", ",").replace("#,", "# ").encode(), set()),
    ("commas and blanks", CELL.replace(" ", " , ").replace("# ,", "# ").encode(), set()),
    ("blanks", CELL.replace(" ", "   ").replace("\n", "  \n   ").encode(), set()),
    ("no final newline", CELL.strip().encode(), set()),
    ("comments within", CELL.replace("\n", " # here\n\n# there\n").encode(), set()),
    ("floats for ids", CELL.replace(" -1\n", " -1.0\n").replace("\n2 ", "\n2.0 ").encode(), set()),
    ("exponents", CELL.replace(" 0.9 ", " 9.0000000000000e-01 ").encode(), set()),
    ("any negative parent is a root", CELL.replace(" -1\n", " -2\n").encode(), set()),
]


@pytest.mark.parametrize(("data", "expected"), [e[1:] for e in ENCODED], ids=[e[0] for e in ENCODED])
def test_text_in_any_dress_gives_the_same_cell(data, expected):
    table = read_swc(data)
    assert {f.code for f in table.findings} == expected
    tree, plain = build_tree(table)[0], build_tree(read_swc_text(CELL))[0]
    for field in ("ids", "kinds", "xyz_um", "radius_um", "parent"):
        np.testing.assert_array_equal(getattr(tree, field), getattr(plain, field))


def test_lines_are_counted_as_an_editor_counts_them():
    text = "# a\r\r\n\r\r\n1 1 0 0 0 8 -1\r\r\n# b\r\r\n2 3 20 0 0 0 1\r\r\n"
    (error,) = [f for f in read_swc(text.encode()).findings if f.severity == "error"]
    assert error.line == 5


def test_ids_may_begin_at_zero_have_gaps_and_stand_in_any_order():
    text = "7 3 40 0 0 0.5 4\n4 3 20 0 0 1 0\n0 1 0 0 0 8 -1\n9 4 0 20 0 1 0\n"
    tree, findings = build_tree(read_swc_text(text))
    assert tree.ids.tolist() == [0, 4, 7, 9]
    assert tree.parent.tolist() == [-1, 0, 1, 0]
    assert "child-before-parent" in {f.code for f in findings}


def test_rows_that_are_in_order_stay_as_they_stand():
    text = "1 1 0 0 0 8 -1\n9 3 20 0 0 1 1\n5 4 0 20 0 1 1\n7 3 40 0 0 1 9\n6 4 0 40 0 1 5\n"
    assert build_tree(read_swc_text(text))[0].ids.tolist() == [1, 9, 5, 7, 6]


def test_an_empty_field_between_commas_does_not_shift_the_columns():
    assert "not-a-number" in codes("1,1,0,0,0,8,-1\n2,3,,20,0,0,1,1\n2,3,9,,0,1,1\n") | codes("1,1,0,,0,8,-1\n")


def test_the_error_names_file_line_and_remedy_and_survives_pickling():
    with pytest.raises(SwcError) as refused:
        CellTree.from_text(changed(9, "8 2 0 -50 1 0 8"), name="odd.swc")
    text = str(refused.value)
    assert text.startswith("odd.swc, line 9: 1 row is its own parent (ids 8). Correct the parent")
    assert text.endswith("(and 1 more)")
    assert str(pickle.loads(pickle.dumps(refused.value))) == text


def test_a_missing_file_is_said_plainly(tmp_path):
    with pytest.raises(SwcError, match=r"none\.swc: the file cannot be opened"):
        read_swc(tmp_path / "none.swc")
    with pytest.raises(SwcError, match="cannot be opened"):
        read_swc(tmp_path)


def test_a_finding_as_a_dict_and_a_severity_that_does_not_exist():
    finding = Finding("a-code", "note", 3, "found", "Do.")
    assert finding.as_dict() == {
        "code": "a-code",
        "severity": "note",
        "line": 3,
        "message": "found",
        "remedy": "Do.",
    }
    with pytest.raises(ValueError, match="severity"):
        Finding("a-code", "fatal", None, "", "")


def test_text_from_a_file_is_shown_escaped():
    (finding,) = [f for f in read_swc_text(changed(4, "3 3 40 3 0 \x1b[31m<b> 2")).findings if f.severity == "error"]
    assert "\x1b" not in finding.message
    assert "\\x1b" in finding.message


# --- from rows to a tree


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
