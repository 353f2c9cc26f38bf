"""The README's pictures are those that one command makes."""

from __future__ import annotations

import re
import runpy
from pathlib import Path

import numpy as np
import pytest
from PIL import Image

ROOT = Path(__file__).parents[2]
GALLERY = ROOT / "examples" / "gallery"
MADE = runpy.run_path(str(ROOT / "examples" / "gallery.py"), run_name="read")


def test_every_picture_of_the_readme_is_made_by_the_command() -> None:
    shown = re.findall(r"!\[[^\]]+\]\(([^)]+)\)", (ROOT / "README.md").read_text(encoding="utf-8"))
    assert shown and all(path.startswith("examples/gallery/") for path in shown)
    assert {Path(path).name for path in shown} <= set(MADE["PICTURES"])
    assert {path.name for path in GALLERY.iterdir()} == set(MADE["PICTURES"])


@pytest.fixture(scope="module")
def fresh(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder: Path = tmp_path_factory.mktemp("gallery")
    MADE["make"](folder)
    return folder


@pytest.mark.parametrize("name", sorted(MADE["PICTURES"]))
def test_pictures_are_not_stale(name: str, fresh: Path) -> None:
    """Compared coarsely, since another version of the drawing library moves letters by a pixel."""
    old, new = (Image.open(folder / name).convert("L") for folder in (GALLERY, fresh))
    assert abs(old.width - new.width) <= 2 and abs(old.height - new.height) <= 2
    coarse = [np.asarray(one.resize((48, 48), Image.Resampling.BOX), dtype=float) / 255 for one in (old, new)]
    assert np.abs(coarse[0] - coarse[1]).max() < 0.05
    assert np.ptp(coarse[1]) > 0.2  # something is drawn
