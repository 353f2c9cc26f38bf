"""Keys of [[input]] beyond the usual: lists of synapses, charge, sizes, shared spikes; and their mistakes."""

from __future__ import annotations

import csv
import hashlib
import json
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from typer.testing import Result

from cable.desk.problems import ScenarioError
from cable.desk.scenario import load_scenario, read_scenario
from cable.theory.kernel import Kernel
from tolerances import EXACT

WHERE = 'where = { kinds = ["basal"], path_um = [200, inf] }\ndensity_per_um = 0.5\n'
EVENT = "conductance_nS = 0.5\nreversal_mV = 0.0\nkernel = { rise_ms = 0.2, decay_ms = 2.0 }\n"
LIST = "number,swc_id,fraction\r\n3,7,\r\n\r\n1.5,12,0.25\r\n,30,1\r\n"
AT = "at = [{ swc_id = 7, number = 3 }, { swc_id = 12, fraction = 0.25, number = 1.5 }, { swc_id = 30 }]\n"


def message(path: Path) -> str:
    with pytest.raises(ScenarioError) as caught:
        load_scenario(path)
    return str(caught.value)


# ---- lists of synapses


@pytest.fixture
def listed(folder: Path, edited: Callable[..., Path]) -> Path:
    """A scenario whose excitation stands in `list.csv`."""
    (folder / "list.csv").write_text(LIST, newline="")
    return edited((WHERE, 'synapses = "list.csv"\n'))


def test_a_list_is_the_same_synapses_in_place(listed: Path, folder: Path, edited: Callable[..., Path]) -> None:
    read = read_scenario(listed)
    field, same = read.model.fluctuations(), load_scenario(edited((WHERE, AT))).fluctuations()
    np.testing.assert_allclose(field.variance_mV2, same.variance_mV2, rtol=1e-13)
    np.testing.assert_allclose(field.mean_mV, same.mean_mV, rtol=1e-14)
    assert [p.number for p in read.model.inputs[0].at] == [3.0, 1.5, 1.0]


def test_a_list_is_an_input_of_the_run(listed: Path, folder: Path, run: Callable[..., Result]) -> None:
    read = read_scenario(listed)
    parts = [p.read_bytes() for p in (listed, folder / "stick.swc", folder / "list.csv")]
    assert read.sha256 == hashlib.sha256(b"".join(parts)).hexdigest()
    refused = run("table", listed.name, "--out", "list.csv", "--force")
    assert refused.exit_code == 2 and "is an input of this run" in refused.stderr
    assert (folder / "list.csv").read_bytes() == parts[2]


@pytest.mark.parametrize("text", ["\ufeff" + LIST, '"swc_id"\n"7"\n', "swc_id , fraction\n 7 , 0.5 \n"])
def test_lists_as_programs_write_them(text: str, listed: Path, folder: Path) -> None:
    (folder / "list.csv").write_text(text, encoding="utf-8", newline="")
    assert load_scenario(listed).inputs[0].at[0].site.swc_id == 7


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", "line 1: is empty, expected a header with the columns swc_id, fraction and number"),
        ("\n\n", "line 1: is empty"),
        ("swc_id\n", "line 1: found a header alone, expected at least one row"),
        ("swc_id;number\n7;1\n", 'line 1: found "swc_id;number", expected columns with commas between them'),
        ("\nswcid,number\n7,1\n", 'line 2: found the column "swcid", did you mean "swc_id"?'),
        ("fraction\n0.5\n", "line 1: found fraction, expected a column swc_id; add it"),
        ("swc_id,swc_id\n7,7\n", 'line 1: found the column "swc_id" twice'),
        ("swc_id,number\n7\n", "line 2: found 1 cell, expected 2 (swc_id and number); correct the row"),
        ("swc_id\n7,8\n", "line 2: found 2 cells, expected 1"),
        ("swc_id\n7\n\n7.5\n", 'line 4, column swc_id: found "7.5", expected an SWC id, a whole number; correct it'),
        ("swc_id,number\n,1\n", "line 2, column swc_id: found an empty cell, expected an SWC id"),
        ("swc_id\n7\n999\n", "line 3, column swc_id: found 999, expected the SWC id of a point of stick.swc"),
        ("swc_id,fraction\n7,1.5\n", 'line 2, column fraction: found "1.5", expected a number from 0'),
        ("swc_id,fraction\n7,nan\n", 'line 2, column fraction: found "nan"'),
        ("swc_id,fraction\n7,half\n", 'line 2, column fraction: found "half"'),
        ("swc_id,number\n7,0\n", 'line 2, column number: found "0", expected a number of synapses above 0'),
        ("swc_id,number\n7,inf\n", 'line 2, column number: found "inf"'),
        ('swc_id\n"7"8\n', "line 2: is not CSV"),
        ("swc_id\n7\n" + "8" * 200 + "\n", "line 3, column swc_id: found"),
        (b"swc_id\n7\n\xff\n", "line 3: is not UTF-8 text"),
        ("swc_id\n\x1b[31m\n", 'found "\\x1b[31m"'),
    ],
)
def test_mistakes_in_a_list_name_file_line_and_column(
    text: str | bytes, words: str, listed: Path, folder: Path, run: Callable[..., Result]
) -> None:
    (folder / "list.csv").write_bytes(text if isinstance(text, bytes) else text.encode())
    said = run("table", listed.name)
    assert said.exit_code == 2
    assert said.stderr.startswith("list.csv: ") and words in said.stderr


def test_several_mistakes_in_a_list_come_together(listed: Path, folder: Path) -> None:
    (folder / "list.csv").write_text("swc_id,number\nx,1\n7,-1\n8\n")
    said = message(listed)
    assert [line.split(": ")[1] for line in said.splitlines()] == [
        "line 2, column swc_id",
        "line 3, column number",
        "line 4",
    ]


def test_a_missing_list_is_named_by_its_key(listed: Path, folder: Path) -> None:
    (folder / "list.csv").unlink()
    said = message(listed)
    assert "input[0].synapses: " in said and "list.csv" in said and 'input "excitation"' in said


# ---- keys


@pytest.mark.parametrize(
    ("changes", "key", "words"),
    [
        ([(WHERE, AT + 'synapses = "x.csv"\n')], "input[0]", "found at and synapses, expected one of them"),
        (
            [("density_per_um = 0.5", 'density_per_um = 0.5\nsynapses = "x.csv"')],
            "input[0]",
            "found synapses and where and density_per_um, expected either synapses, or where with a density",
        ),
        ([(WHERE, "")], "input[0]", "found no density"),
        ([(WHERE, 'synapses = ""\n')], "input[0].synapses", "expected some text"),
        ([(EVENT, "charge_fC = 4\ncurrent_pA = 2\n")], "input[0]", "found both of current_pA and charge_fC"),
        ([(EVENT, EVENT + "charge_fC = 4\ncurrent_pA = 2\n")], "input[0]", "found all of conductance_nS, current_pA"),
        ([(EVENT, "kernel = { decay_ms = 2 }\n")], "input[0]", "found neither of conductance_nS, current_pA or charge"),
        ([(EVENT, "charge_fC = 4\nreversal_mV = 0\n")], "input[0]", "take reversal_mV out: charge_fC has none"),
        ([(EVENT, 'charge_fC = "4 fC"\n')], "input[0].charge_fC", "without quotes"),
        ([(EVENT, "current_pA = 4\n")], "input[0]", "found current_pA without kernel, expected the time course"),
        ([("kernel = { rise_ms = 0.2, decay_ms = 2.0 }\n", "")], "input[0]", "found conductance_nS without kernel"),
        ([("conductance_nS = 0.5", "conductance_nS = 0")], "input[0].conductance_nS", "above 0"),
        (
            [(EVENT, 'charge_fC = 4\nkernel = { expression = "exp(-t/2)*(1 - t/2)" }\n')],
            "input[0]",
            "a kernel of area 0",
        ),
        ([("rate_Hz = 2.0", "rate_Hz = 2.0\nsize_cv = -1")], "input[0].size_cv", "at least 0"),
        (
            [("rate_Hz = 2.0", "rate_Hz = 200.0\nspike_train = { dead_time_ms = 10 }")],
            "input[0]",
            "dead_time_ms = 10 allows rates below 100 Hz, found 200 Hz",
        ),
        ([("rate_Hz = 2.0", "rate_Hz = 2.0\nspike_train = { order = 0.5 }")], "input[0].spike_train.order", "least 1"),
        (
            [("rate_Hz = 2.0", 'rate_Hz = 2.0\nshares = [{ input = "inhibitio", fraction = 0.1 }]')],
            "input[0].shares[0]",
            "found 'inhibitio', expected the name of another input: 'inhibition'",
        ),
        (
            [("rate_Hz = 2.0", 'rate_Hz = 2.0\nshares = [{ input = "inhibition", fraction = 2 }]')],
            "input[0].shares[0].fraction",
            "at most 1",
        ),
        (
            [("rate_Hz = 2.0", 'rate_Hz = 2.0\nshares = [{ input = "inhibition", share = 0.1 }]')],
            "input[0].shares[0].share",
            "unknown key",
        ),
        (
            [("rate_Hz = 2.0", 'rate_Hz = 2.0\nshares = [{ input = "inhibition", fraction = 0.1 }]')],
            "input[0].shares[0]",
            "expected at most the root of their product, 0: trains that share spikes",
        ),
    ],
)
def test_mistakes(changes: list[tuple[str, str]], key: str, words: str, edited: Callable[..., Path]) -> None:
    said = message(edited(*changes))
    assert f"edited.toml: {key}: " in said and words in said, said
    assert "Traceback" not in said


def test_charge_with_and_without_kernel_and_sizes(edited: Callable[..., Path]) -> None:
    first = load_scenario(edited((EVENT, "charge_fC = 4\nsize_cv = 0.3\n"))).inputs[0]
    assert (first.charge_fC, first.kernel, first.size_cv) == (4.0, Kernel.impulse(), 0.3)
    first = load_scenario(edited((EVENT, "charge_fC = 4\nkernel = { alpha_ms = 2 }\n"))).inputs[0]
    assert first.kernel == Kernel.alpha(2.0)


# ---- what becomes of them


def test_an_infinite_variance_is_no_number(edited: Callable[..., Path], run: Callable[..., Result]) -> None:
    path = edited((WHERE, "at = [{ swc_id = 22 }]\n"), (EVENT, "charge_fC = 4\n"))
    shown = run("table", path.name)
    row = next(line for line in shown.stdout.splitlines() if "half way" in line)
    assert "undefined" in row and "nan" not in shown.stdout
    assert "no SD where point synapses whose charge comes at once" in shown.stdout
    assert run("table", path.name, "--out", "t.json").exit_code == 0
    found = json.loads(path.with_name("t.json").read_text())
    by_site = {r["site"]: r for r in found["rows"]}
    assert by_site["half way"]["sd_mV"] is None and by_site["between"]["sd_mV"] > 0
    assert found["variance_note"].startswith("no SD where")
    assert run("table", path.name, "--out", "t.csv").exit_code == 0
    with path.with_name("t.csv").open(newline="") as stream:
        assert {r["site"]: r["sd_mV"] for r in csv.DictReader(stream)}["half way"] == ""
    refused = run("sources", path.name, "half way")
    assert refused.exit_code == 2 and "the variance is infinite at a place asked for" in refused.stderr
    shown = run("point-neuron", path.name, "half way")
    assert shown.exit_code == 0 and "nan" not in shown.stdout and "no autocovariance: no SD where" in shown.stdout
    assert "capacitance over conductance of the whole cell" in shown.stdout
    for command in (("map", path.name), ("along", path.name, "half way")):
        assert run(*command, "--out", f"{command[0]}.png").exit_code == 0
    assert "no SD where" in run("along", path.name, "half way").stdout


def test_shared_spikes_are_a_column_of_their_own(edited: Callable[..., Path], run: Callable[..., Result]) -> None:
    path = edited(
        ("rate_Hz = 2.0", 'rate_Hz = 3.0\ncorrelation = 0.1\nshares = [{ input = "inhibition", fraction = 0.05 }]'),
        ("rate_Hz = 3.0\nconductance_nS = 0.6", "rate_Hz = 3.0\ncorrelation = 0.1\nconductance_nS = 0.6"),
    )
    assert run("table", path.name, "--out", "t.csv").exit_code == 0
    with path.with_name("t.csv").open(newline="") as stream:
        rows = list(csv.DictReader(stream))
    parts = [f"variance_{name}_mV2" for name in ("excitation", "inhibition", "shared")]
    for row in rows:
        total = sum(float(row[part]) for part in parts)
        assert total == pytest.approx(float(row["variance_mV2"]), rel=EXACT)
        assert float(row["variance_shared_mV2"]) < 0
    shown = run("table", path.name).stdout
    assert "shared" in shown
    assert run("map", path.name, "--quantity", "share", "--input", "shared", "--out", "m.png").exit_code == 0
    assert run("spectrum", path.name, "soma", "--out", "s.csv").exit_code == 0
    assert "psd_shared_mV2_per_Hz" in path.with_name("s.csv").read_text().splitlines()[0]
    assert run("pair", path.name, "soma", "half way", "--out", "p.json").exit_code == 0
    assert run("record", path.name, "soma").exit_code == 0
