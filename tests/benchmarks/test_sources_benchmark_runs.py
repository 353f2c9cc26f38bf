"""The benchmark of sources and modes runs and finds its answers right; its times are nobody's assertion."""

from __future__ import annotations

import json
import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))  # the benchmarks are scripts and import one another by name

from sources_speed import SMALL, main


@pytest.mark.parametrize("arguments", [[str(SMALL)], ["--points", "600"]])
def test_answers_are_checked_and_told(capsys: pytest.CaptureFixture[str], arguments: list[str]) -> None:
    main(arguments)
    told = json.loads(capsys.readouterr().out)
    assert told["points"] in (403, 600)
    assert max(told["max_relative_difference"].values()) < 1e-6
    assert 0 < told["share_of_the_modes"] < 1 < told["participation"]
    assert all(told[key] > 0 for key in ("sources_s", "modes_s", "peak_MB"))
