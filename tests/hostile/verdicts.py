"""What became of one hostile file: a clean refusal or an answer that holds together. All else is a `Defect`."""

from __future__ import annotations

import random
from pathlib import Path

from cable.desk.problems import ScenarioError
from cable.desk.scenario import read_scenario
from cable.noise.model import ModelError
from hostile.guards import Defect, clean_refusal, guarded, nothing_executes
from hostile.soundness import answer, model_of
from morphology import SwcError
from morphology.swc import build_tree, read_swc


def try_swc(data: bytes, folder: Path, draw: random.Random) -> str:
    """The verdict on the bytes of an SWC file."""

    def work() -> str:
        table = read_swc(data, name="cell.swc")
        for finding in table.findings:
            clean_refusal(ValueError(f"{finding.message} {finding.remedy}"))
        try:
            tree, _ = build_tree(table)
        except SwcError as error:
            if table.usable:
                raise Defect("refused without an error among the findings") from error
            return clean_refusal(error, "cell.swc")
        try:
            model = model_of(tree)
        except ModelError as error:
            return clean_refusal(error)
        return answer(model, draw)

    with nothing_executes(folder):
        return guarded(work)


def try_scenario(files: dict[str, bytes], folder: Path, draw: random.Random) -> str:
    """The verdict on a scenario and the files beside it."""
    for name, data in files.items():
        (folder / name).write_bytes(data)

    def work() -> str:
        try:
            read = read_scenario(folder / "scenario.toml")
        except ScenarioError as error:
            # the scenario, or the list that it names
            return clean_refusal(error, Path(error.file).name[:50])
        return answer(read.model, draw)

    with nothing_executes(folder):
        verdict = guarded(work)
    unchanged(files, folder)
    return verdict


def unchanged(files: dict[str, bytes], folder: Path) -> None:
    """Check that reading wrote nothing."""
    if {p.name: p.read_bytes() for p in folder.iterdir() if p.name in files} != files:
        raise Defect("an input file was changed")
