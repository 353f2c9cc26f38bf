"""The house's own rules: which way imports point, and what importing the packages may load."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent
ABOVE = {
    "morphology": ("cable",),
    "cable/theory": ("cable.network", "cable.noise", "cable.simulation", "cable.desk"),
    "cable/network": ("cable.noise", "cable.simulation", "cable.desk"),
    "cable/noise": ("cable.simulation", "cable.desk"),
    "cable/simulation": ("cable.desk",),
}


@pytest.mark.parametrize("folder", ABOVE)
def test_arrows_run_one_way(folder: str) -> None:
    files = sorted((ROOT / folder).rglob("*.py"))
    assert len(files) > 3
    for file in files:
        for node in ast.walk(ast.parse(file.read_text(encoding="utf-8"))):
            names = [a.name for a in node.names] if isinstance(node, ast.Import) else []
            if isinstance(node, ast.ImportFrom):
                assert node.level == 0, f"{file}: a relative import hides where its arrow points"
                names += [f"{node.module}.{a.name}" for a in node.names]
            for name in names:
                assert not any(name == up or name.startswith(f"{up}.") for up in ABOVE[folder]), f"{file}: {name}"


def test_geometry_knows_no_electricity() -> None:
    code = "import sys, morphology; print([m for m in sys.modules if m.split('.')[0] == 'cable'])"
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=ROOT)
    assert run.stdout.strip() == "[]"


@pytest.mark.parametrize("package", ["cable", "morphology"])
def test_importing_loads_no_heavy_library(package: str) -> None:
    heavy = "matplotlib", "sympy", "networkx", "pydantic", "typer", "rich", "jinja2"
    code = f"import sys, {package}; print([m for m in {heavy!r} if m in sys.modules])"
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=ROOT)
    assert run.stdout.strip() == "[]"


def test_top_level_is_the_one_that_was_agreed() -> None:
    listed = subprocess.run(["git", "ls-tree", "--name-only", "HEAD"], capture_output=True, text=True, cwd=ROOT)
    if listed.returncode:
        pytest.skip("not a git checkout")
    names = {name for name in listed.stdout.split() if not name.startswith(".")}
    assert names == {
        "README.md",
        "DEVELOPERS.md",
        "pyproject.toml",
        "cable",
        "morphology",
        "tests",
        "examples",
    }


def test_continuous_integration_runs_the_readmes_test_command() -> None:
    readme, script = (
        (ROOT / "README.md").read_text(encoding="utf-8"),
        (ROOT / ".ci" / "run").read_text(encoding="utf-8"),
    )
    command = next(line for line in readme.splitlines() if "pytest" in line and line.startswith("python3 -m venv"))
    for step in command.split(" && "):
        assert step in script
