"""A folder to begin with: an invented cell and a scenario that runs."""

from __future__ import annotations

from pathlib import Path

from cable.desk.files import check_folder, output
from cable.desk.messages import DeskError, shown
from cable.desk.template import SCENARIO, SEED
from morphology.growth import neuron
from morphology.swc import to_text

CELL_HEADER = "# Heron: an invented cell, grown by a program. No animal was involved.\n"


def write_example(folder: str | Path, force: bool = False) -> Path:
    """Write `heron.swc` and `heron.toml` into a folder, which is made where it is missing.

    Returns:
        The scenario's path.

    Raises:
        DeskError: the folder cannot be made, or the files exist and `force` is not given.
    """
    place = Path(folder)
    try:
        place.mkdir(parents=True, exist_ok=True)
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or "not the name of a folder"
        raise DeskError(f"{shown(place)}: the folder cannot be made ({reason}); choose another") from None
    check_folder(place, place)
    texts = {"heron.swc": cell_text(), "heron.toml": SCENARIO}
    # both are checked before either is written
    targets = {name: output(place / name, (".swc", ".toml"), force) for name in texts}
    for name, target in targets.items():
        with target.writing(text=True) as stream:
            stream.write(texts[name])
    return place / "heron.toml"


def cell_text() -> str:
    """The invented cell as SWC text."""
    rows = [line for line in to_text(neuron(SEED)).splitlines(keepends=True) if not line.startswith("#")]
    return CELL_HEADER + "# id kind x y z radius parent (lengths in um)\n" + "".join(rows)
