"""Make the pictures of the README anew.

    python examples/gallery.py [FOLDER]

Each picture is one command on the invented cell; without FOLDER they go into examples/gallery.
"""

from __future__ import annotations

import sys
from pathlib import Path

from cable.desk.cli import app

HERE = Path(__file__).parent
PICTURES = {
    "map.png": ("map",),
    "branches.png": ("map", "--branches", "--quantity", "sd"),
    "along.png": ("along", "tuft"),
    "correlation.png": ("map", "--quantity", "correlation", "--with", "soma"),
    "matrix.png": ("pair", "--all"),
    "spectrum.png": ("spectrum", "soma"),
    "pair.png": ("pair", "soma", "tuft"),
    "sources.png": ("sources", "soma"),
    "excursions.png": ("excursions",),
    "modes.png": ("modes",),
}


def make(folder: Path) -> None:
    """Write all pictures into a folder."""
    folder.mkdir(parents=True, exist_ok=True)
    for name, (command, *rest) in PICTURES.items():
        scenario = str(HERE / "heron" / "heron.toml")
        app([command, scenario, *rest, "--out", str(folder / name), "--force"], standalone_mode=False)


if __name__ == "__main__":
    make(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE / "gallery")
