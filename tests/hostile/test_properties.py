"""Properties that must hold for any bytes and any names, tried by hypothesis."""

from __future__ import annotations

import csv
import io
import json
import random

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from cable.desk.messages import quoted, shown
from cable.desk.synapse_list import read_synapses
from cable.desk.tables import FORMULA_STARTS, Table, to_json, write_csv
from hostile import bases
from hostile.clothes import same_answer
from hostile.fuzz import beside
from hostile.verdicts import try_scenario, try_swc
from morphology.swc import read_swc

quick = settings(max_examples=60, deadline=None, derandomize=True)
any_text = st.text(max_size=200)
number = st.one_of(
    st.integers(-5, 12), st.floats(allow_nan=True, allow_infinity=True), st.sampled_from(["NA", "1e400", "", "0x1"])
)
rows = st.lists(st.tuples(*[number] * 7), max_size=12)


@quick
@given(st.binary(max_size=300))
def test_any_bytes_are_read_or_refused(tmp_path_factory, data):
    try_swc(data, tmp_path_factory.getbasetemp(), random.Random(1))
    try_swc(b"1 1 0 0 0 8 -1\n2 3 9 0 0 1 1\n" + data, tmp_path_factory.getbasetemp(), random.Random(1))


@quick
@given(rows)
def test_any_rows_are_a_cell_or_refused(tmp_path_factory, rows):
    text = "\n".join(["1 1 0 0 0 8 -1", *(" ".join(map(str, row)) for row in rows)])
    try_swc(text.encode(), tmp_path_factory.getbasetemp(), random.Random(1))


@pytest.mark.parametrize("name", bases.CELLS)
@settings(max_examples=8, deadline=None, derandomize=True)
@given(st.randoms(use_true_random=False))
def test_a_cell_in_other_clothes_gives_the_same_answer(name, draw):
    assert same_answer(bases.CELLS[name].encode(), draw) == "answered"


@quick
@given(st.binary(max_size=120), st.integers(0, len(bases.SCENARIO)))
def test_any_bytes_in_a_scenario(tmp_path_factory, data, at):
    raw = bases.SCENARIO.encode()
    folder = tmp_path_factory.getbasetemp()
    try_scenario(beside(raw[:at] + data + raw[at:]), folder, random.Random(1))


@quick
@given(st.text(max_size=120))
def test_any_text_is_a_list_of_synapses_or_refused(text):
    from cable.desk.problems import ScenarioError

    for whole in (text, bases.LIST + text):
        try:
            found = read_synapses(whole.encode("utf-8", "surrogatepass"), "list.csv")
        except ScenarioError as error:
            assert str(error).startswith("list.csv: ")
        else:
            assert all(0 <= one.fraction <= 1 and 0 < one.number < float("inf") for one in found)


@quick
@given(any_text)
def test_shown_text_is_one_line_that_a_terminal_does_not_obey(text):
    assert shown(text).isprintable() and len(shown(text)) <= 2000
    assert quoted(text).isprintable()


@quick
@given(any_text, any_text)
def test_csv_cells_begin_no_formula_and_read_back(name, cell):
    stream = io.StringIO()
    write_csv(Table({f"variance_{name}": [cell], "x": [1.0]}), stream)
    header, row = csv.reader(io.StringIO(stream.getvalue(), newline=""))
    assert not header[0].startswith(FORMULA_STARTS) and not row[0].startswith(FORMULA_STARTS)
    assert header[0].removeprefix("'") == f"variance_{name}" and row[0].removeprefix("'") == cell.removeprefix("'")
    assert row[1] == "1.0"


@quick
@given(st.dictionaries(any_text, st.one_of(any_text, st.floats()), max_size=4))
def test_json_reads_back_and_never_holds_nan(values):
    def refuse(word: str) -> None:
        raise AssertionError(word)

    read = json.loads(to_json(values), parse_constant=refuse)
    assert {k: v for k, v in read.items() if v is not None} == {
        k: v for k, v in values.items() if isinstance(v, str) or abs(v) < float("inf")
    }


@quick
@given(st.binary(max_size=200))
def test_findings_are_printable_whatever_the_file_holds(data):
    for finding in read_swc(b"1 1 0 0 0 8 -1\n" + data, name="cell.swc").findings:
        assert finding.message.isprintable() and finding.remedy.isprintable()
