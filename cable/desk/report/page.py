"""The page: data, style and script put into one HTML file which loads nothing and runs nothing else."""

from __future__ import annotations

import base64
import hashlib
import json
import shlex
from collections.abc import Callable
from importlib.resources import files
from os import PathLike
from pathlib import Path
from typing import TYPE_CHECKING, Any

from cable.desk.files import output
from cable.desk.messages import version
from cable.desk.report.gather import page_data
from cable.desk.report.words import headline, measures_rows, notes
from cable.noise.cards import event_words

if TYPE_CHECKING:
    from cable.desk.scenario import Scenario
    from cable.noise.fluctuations import Fluctuations
    from cable.noise.model import CableModel

ENDINGS = (".html",)
SCRIPTS = ("data.js", "map.js", "pointing.js", "curves.js", "table.js", "page.js")


def render(
    field: Fluctuations,
    scenario: Scenario | None = None,
    name: str = "report.html",
    tell: Callable[[float], None] = lambda share: None,
) -> str:
    """The HTML text of a report.

    Args:
        scenario: the scenario that made the model, if a file did: its text and findings are shown.
        name: the name of the file, for the command that is shown. Folders are never shown.
        tell: hears the share of the work that is done.
    """
    from jinja2 import Environment, PackageLoader, StrictUndefined

    model = field.model
    style = _text("report.css")
    script = f'"use strict";\n(() => {{\n{"".join(_text(part) for part in SCRIPTS)}}})();\n'
    page = Environment(
        loader=PackageLoader("cable.desk.report", "."), autoescape=True, undefined=StrictUndefined, trim_blocks=True
    ).get_template("page.html")
    return page.render(
        title=(scenario.title if scenario else model.title) or model.tree.name or "A cell",
        headline=headline(field),
        cell=model.tree.name,
        membrane=model.membrane,
        inputs=[(one, *event_words(one)) for one in model.inputs],
        sites=[field.at(one) for one in model.site_names],
        notes=notes(field),
        certificate=field.certificate,
        measures=measures_rows(field),
        findings=list(scenario.findings) if scenario else None,
        scenario=scenario,
        command=_command(scenario, name) if scenario else None,
        version=version(),
        style=style,
        script=script,
        style_hash=_hash(style),
        script_hash=_hash(script),
        data=in_script(page_data(field, tell)),
    )


def write_report(model: CableModel, path: str | PathLike[str], *, force: bool = False, tolerance: float = 1e-9) -> Path:
    """Write the report of a model; see `cable.write_report`."""
    target = output(path, ENDINGS, force)
    text = render(model.fluctuations(tolerance), None, target.path.name)
    with target.writing(text=True) as stream:
        stream.write(text)
    return target.path


def in_script(value: Any) -> str:
    """JSON that may stand inside a script element: no text in it can end the element or open another."""
    text = json.dumps(value, ensure_ascii=True, allow_nan=False, separators=(",", ":"))
    return text.replace("&", "\\u0026").replace("<", "\\u003c").replace(">", "\\u003e")


def _command(scenario: Scenario, name: str) -> str:
    return f"cablenoise report {shlex.quote(scenario.path.name)} --out {shlex.quote(name)}"


def _text(name: str) -> str:
    return files("cable.desk.report").joinpath(name).read_text(encoding="utf-8")


def _hash(text: str) -> str:
    """What the page's own policy knows the text by."""
    return f"sha256-{base64.b64encode(hashlib.sha256(text.encode('utf-8')).digest()).decode('ascii')}"
