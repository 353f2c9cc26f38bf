"""The simulation's benchmark runs and checks its answer."""

from __future__ import annotations

from pathlib import Path

import pytest

from morphology.growth import ball_and_stick


def test_it_runs_and_checks_first(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.syspath_prepend(str(Path(__file__).parent))
    import simulation_speed

    found = simulation_speed.steps_per_second(ball_and_stick(8.0, 300.0, 1.0), 2)
    assert found["steps_per_second"] > 0 and found["compartments"] > 3
    price = simulation_speed.price(8.0)
    assert price["worst_z"] < 4.5 and price["ratio"] > 1
