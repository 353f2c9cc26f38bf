"""`start`: the example runs as written, is the one in the repository, and is as lively as it says."""

from __future__ import annotations

from pathlib import Path

import pytest

from cable.desk.scenario import read_scenario
from cable.desk.start import write_example

EXAMPLE = Path(__file__).parents[2] / "examples" / "heron"


def test_the_example_in_the_repository_is_what_the_command_writes(tmp_path):
    write_example(tmp_path / "new" / "demo")
    for name in ("heron.swc", "heron.toml"):
        assert (tmp_path / "new" / "demo" / name).read_bytes() == (EXAMPLE / name).read_bytes()


def test_the_cell_says_that_it_is_invented():
    assert "invented" in (EXAMPLE / "heron.swc").read_text().splitlines()[0]


def test_the_example_is_in_the_range_of_an_awake_cell():
    read = read_scenario(EXAMPLE / "heron.toml")
    assert read.findings == () or all(f.severity == "note" for f in read.findings)
    assert len(read.model.site_names) == 4
    field = read.model.fluctuations(1e-6)
    assert 1 < field.sd_mV.min() and field.sd_mV.max() < 6
    assert field.mean_mV.max() < read.model.threshold_mV - 5
    soma = field.at("soma")
    assert 2 < soma.sd_mV < 4 and -62 < soma.mean_mV < -58


def test_what_stands_in_comments_works_when_it_is_taken_out_of_them(folder):
    path = write_example(folder / "demo")
    text = path.read_text()
    for line in ("#[[electrode]]", "#site", "#series_res", "#pipette", "#filter"):
        assert line in text
        text = text.replace(line, line[1:])
    shares = text.partition("shares = ")[2].partition("]")[0] + "]"
    text = text.replace("\ncorrelation = 0.003\n", f"\ncorrelation = 0.003\nshares = {shares}\n")
    listed = text.replace("density_per_um2 = 0.02\n", 'synapses = "list.csv"\n').replace(
        'where = { kinds = ["soma", "basal", "apical"], path_um = [0, 150] }\n', ""
    )
    (path.parent / "list.csv").write_text("swc_id,fraction,number\n211,0.5,3\n1,,\n")
    path.write_text(listed)
    model = read_scenario(path).model
    assert model.electrodes[0].pipette_capacitance_pF == 6.0 and model.part_names[-1] == "shared"
    assert [one.number for one in model.inputs[2].at] == [3.0, 1.0]


def test_next_command_is_said_and_works(run, folder):
    result = run("start", "my demo")
    assert result.exit_code == 0
    assert "next: cablenoise table 'my demo/heron.toml'" in result.stdout
    assert run("table", "my demo/heron.toml", "--tolerance", "1e-4").exit_code == 0


def test_files_are_not_replaced_without_force(run, folder):
    (folder / "heron.toml").write_text("mine")
    result = run("start", ".")
    assert result.exit_code == 2 and "heron.toml: exists already" in result.stderr
    assert not (folder / "heron.swc").exists()
    assert (folder / "heron.toml").read_text() == "mine"
    assert run("start", ".", "--force").exit_code == 0
    assert (folder / "heron.toml").read_text() != "mine"


@pytest.mark.parametrize("place", ["stick.swc", "stick.swc/below", "a\0b"])
def test_a_folder_that_cannot_be_made(run, place):
    result = run("start", place)
    assert result.exit_code == 2
    assert "cannot be made" in result.stderr
