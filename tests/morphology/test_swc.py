"""Reading SWC text: every oddity is one finding with its line and a remedy; clean text round-trips."""

import pickle

import numpy as np
import pytest

from morphology import CellTree, Finding, SwcError
from morphology.swc import build_tree, read_swc, read_swc_text
from swc_texts import CELL, changed, codes, long_dendrite, ring, star, twiggy, two_radii

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
