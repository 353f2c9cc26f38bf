"""What became of one command on hostile files: a result, or one message and no file."""

from __future__ import annotations

import random
from pathlib import Path

from hostile.guards import Defect, guarded
from hostile.verdicts import unchanged

COMMANDS = (
    "table", "table --out OUT.csv", "table --sites --out OUT.json", "table --out OUT.npz --with soma", "pair --all",
    "map --out OUT.svg", "along SITE", "along SITE --out OUT.csv", "spectrum SITE --out OUT.csv", "spectrum SITE",
    "pair soma SITE --out OUT.json", "sources SITE", "sources SITE --out OUT.csv", "point-neuron SITE",
    "excursions SITE", "record SITE", "inspect CELL", "inspect CELL --json", "modes --out OUT.json",
    "report --out OUT.html", "excursions --out OUT.svg", "map --branches --out OUT.svg",
)  # fmt: skip


def try_command(files: dict[str, bytes], folder: Path, draw: random.Random, line: str = "") -> str:
    """Run one command on a scenario, as a person would: exit 0 with a result, or 2 with one message and no file."""
    from typer.testing import CliRunner

    from cable.desk.cli import app

    for name, data in files.items():
        (folder / name).write_bytes(data)
    words = (line or draw.choice(COMMANDS)).split()
    name, *rest = words
    first = str(folder / ("cell.swc" if "CELL" in rest else "scenario.toml"))
    rest = [{"SITE": "half way"}.get(w, str(folder / w) if w.startswith("OUT") else w) for w in rest if w != "CELL"]
    before = {p.name for p in folder.iterdir()}

    def work() -> str:
        result = CliRunner().invoke(app, [name, first, *rest])
        what = f"`{' '.join(words)}`"
        if result.exception is not None and not isinstance(result.exception, SystemExit):
            raise Defect(f"{what}: {type(result.exception).__name__}: {result.exception!s:.300}") from result.exception
        said = result.stdout + result.stderr
        if not all(c.isprintable() or c == "\n" for c in said):
            raise Defect(f"{what} printed signs that a terminal obeys: {said!r:.300}")
        if result.exit_code not in (0, 2):
            raise Defect(f"{what} ended with {result.exit_code}")
        new = {p.name for p in folder.iterdir()} - before
        asked = {p.name for p in map(Path, rest) if p.name.startswith("OUT")}
        if new != (asked if result.exit_code == 0 else set()):
            raise Defect(f"{what} ended with {result.exit_code} and left {sorted(new)}")
        if result.exit_code == 2 and name != "inspect" and (result.stdout or not result.stderr.strip()):
            raise Defect(f"{what} ended with 2 and printed {result.stdout!r:.100}, said {result.stderr!r:.100}")
        return "answered" if result.exit_code == 0 else "refused"

    try:
        return guarded(work)
    finally:
        unchanged(files, folder)
        for path in folder.glob("OUT*"):
            path.unlink()
