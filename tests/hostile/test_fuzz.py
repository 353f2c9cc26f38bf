"""A small run of the fuzz program, and proofs that its verdicts can turn out badly."""

from __future__ import annotations

import random
import time
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from cable.theory.kernel import Kernel
from hostile import bases, verdicts
from hostile.command_verdict import COMMANDS, try_command
from hostile.fuzz import FAMILIES, beside, run
from hostile.guards import Defect, nothing_executes, time_limit
from hostile.kernel_verdict import same_as_text, try_expression
from hostile.soundness import model_of, sound
from hostile.verdicts import try_scenario
from morphology import CellTree


def test_no_input_of_a_seeded_run_is_a_defect():
    tally = run(600, seed=7, command_share=0.0)
    assert not tally.defects, "\n".join(f"{name}: {what}\n{content!r}" for name, what, content in tally.defects)
    assert sum(tally.verdicts.values()) == 600
    for family in FAMILIES:  # each family both answers and refuses, or the run would show little
        assert tally.verdicts[family, "answered"] > 10, tally.verdicts
        assert tally.verdicts[family, "refused"] > 10, tally.verdicts


@pytest.mark.parametrize("line", COMMANDS)
def test_each_command_answers_and_refuses(tmp_path, line):
    draw = random.Random(3)
    assert try_command(beside(bases.LISTED), tmp_path, draw, line) == "answered"
    cell = bases.CELLS["forked"].replace("2 3 9 0 0 1 1", "2 3 9 0 0 0 1")
    assert try_command(beside(bases.LISTED, cell=cell), tmp_path, draw, line) == "refused"


# ------------------------------------------------------------------------------ a verdict that cannot fail is none


def test_writing_elsewhere_is_seen(tmp_path):
    inside = tmp_path / "in"
    inside.mkdir()
    with nothing_executes(inside):
        (inside / "a").write_text("x")
        (tmp_path / "no").exists()
    for act in (lambda: (tmp_path / "b").write_text("x"), lambda: __import__("os").system("true")):
        with pytest.raises(Defect, match="made the program act"), nothing_executes(inside):
            act()


def test_a_hang_is_seen():
    with pytest.raises(Defect, match="no answer within"), time_limit(0.05):
        time.sleep(5)


def test_an_expression_that_runs_is_seen(tmp_path, monkeypatch):
    def careless(text: str) -> Kernel:
        eval(text, {"t": 1.0})
        return Kernel.exponential(1.0)

    monkeypatch.setattr(Kernel, "expression", staticmethod(careless))
    with pytest.raises(Defect, match="made the program act"):
        try_expression(f"open({str(tmp_path / 'owned')!r}, 'w').close()", tmp_path / "elsewhere", random.Random(1))


@pytest.mark.parametrize(
    ("error", "seen"), [(TypeError("x"), True), (RecursionError(), True), (ValueError("x"), False)]
)
def test_an_exception_beside_refusals_is_seen(tmp_path, monkeypatch, error, seen):
    def breaks(text: str) -> Kernel:
        raise error

    monkeypatch.setattr(Kernel, "expression", staticmethod(breaks))
    if seen:
        with pytest.raises(Defect, match=type(error).__name__):
            try_expression("t", tmp_path, random.Random(1))
    else:
        assert try_expression("t", tmp_path, random.Random(1)) == "refused"


def test_a_kernel_that_is_not_its_text_is_seen():
    same_as_text(Kernel.expression("3*t*exp(-t/2)"), "t*exp(-t/2)")
    for other in ("t*exp(-t/2.001)", "t**2*exp(-t/2)", "(t+0.001)*exp(-t/2)"):
        with pytest.raises(Defect):
            same_as_text(Kernel.expression("t*exp(-t/2)"), other)


def test_an_answer_that_does_not_hold_together_is_seen():
    model = model_of(CellTree.from_text(bases.CELLS["forked"]))
    field = model.fluctuations(1e-6)
    sound(model, field)
    for name, value, words in (
        ("_mean", field._mean + 100, "between pulls"),
        ("_mean", field._mean * np.nan, "not finite"),
        ("_by_input", -field._by_input, "variance"),
        ("_resistance", -field._resistance, "resistance"),
    ):
        with pytest.raises(Defect, match=words):
            sound(model, replace(field, **{name: value}))


def test_a_changed_input_file_is_seen(tmp_path: Path, monkeypatch):
    reading = verdicts.read_scenario

    def writes(path: Path):
        read = reading(path)
        (path.parent / "list.csv").write_bytes(b"")
        return read

    monkeypatch.setattr(verdicts, "read_scenario", writes)
    with pytest.raises(Defect, match="input file was changed"):
        try_scenario(beside(bases.LISTED), tmp_path, random.Random(1))
