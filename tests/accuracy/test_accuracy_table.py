"""The table of outside values holds, and the README shows it as it is."""

from __future__ import annotations

import re
import runpy
from pathlib import Path

import pytest

from tolerances import EXACT

HERE = Path(__file__).parent
TABLE = runpy.run_path(str(HERE / "table.py"), run_name="read")
README = (HERE.parents[1] / "README.md").read_text(encoding="utf-8")


@pytest.mark.parametrize("topic", TABLE["TOPICS"], ids=lambda topic: topic.words)
def test_outside_values(topic) -> None:
    count, worst = topic.worst()
    assert count > 0 and worst < EXACT
    shown = re.search(re.escape(f"| {topic.words} | {topic.source} | ") + r"(\d+) \| below (1e-\d+) \|", README)
    assert shown, "the README has another table; run python tests/accuracy/table.py"
    # another machine's last digits may move a difference over the next power of ten
    assert int(shown[1]) == count and worst < 10 * float(shown[2])
