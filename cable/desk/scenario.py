"""From a scenario file to a model: reading, checking, and naming what is wrong by file and key."""

from __future__ import annotations

import hashlib
import tomllib
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property
from os import PathLike
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from cable.desk.messages import choices, did_you_mean, quoted, shown
from cable.desk.problems import Problem, ScenarioError, problems_of
from cable.desk.schema import Document
from cable.desk.synapse_list import read_lists
from cable.noise.model import CableModel, ModelError
from cable.theory.synapse import Placed
from morphology import CellTree, Finding, PlaceError, Site, SwcError, Zone, kind_name
from morphology.reading import bytes_of
from morphology.swc import build_tree, read_swc


@dataclass(frozen=True, eq=False)
class Scenario:
    """A scenario that was read without an error.

    Attributes:
        path: the TOML file.
        morphology_path: the SWC file it names.
        model: cell, membrane, inputs and sites.
        findings: what was odd about the reconstruction (no errors among them).
        sha256: of the bytes of the TOML file followed by those of the SWC file and of the lists of synapses.
        list_paths: the lists of synapses it names.
        text: the TOML file as text.
    """

    path: Path
    morphology_path: Path
    model: CableModel
    findings: tuple[Finding, ...]
    sha256: str
    list_paths: tuple[Path, ...] = ()
    text: str = ""

    @property
    def files(self) -> tuple[Path, ...]:
        """The files that were read and must not be written."""
        return self.path, self.morphology_path, *self.list_paths

    @cached_property
    def title(self) -> str:
        """The title, or the file's name where there is none."""
        return self.model.title or self.path.stem

    def site(self, name: str) -> str:
        """`name` if it is a site of this scenario.

        Raises:
            ScenarioError: it is none; the message names the nearest.
        """
        names = self.model.site_names
        if name not in names:
            message = f"there is no site {quoted(name)}; {did_you_mean(name, names)}"
            raise ScenarioError(str(self.path), [Problem("site", message)])
        return name


def load_scenario(path: str | PathLike[str]) -> CableModel:
    """The model that a scenario file describes.

    Raises:
        ScenarioError: what is wrong, by file and key.
    """
    return read_scenario(path).model


def read_scenario(path: str | PathLike[str]) -> Scenario:
    """A scenario file with its model, the findings about its cell and its hash.

    Raises:
        ScenarioError: what is wrong, by file and key.
    """
    file = str(path)
    raw = _bytes_of(path)
    table = parse_toml(raw, file)
    document = _checked(table, file)
    morphology_path = Path(path).parent / document.cell.morphology
    swc, tree, findings = _read_cell(document, morphology_path, file)
    lists = read_lists(document, Path(path).parent, tree, file)
    sites, placed = _places(document, tree, file)
    placed = tuple(listed.placed if listed else at for listed, at in zip(lists, placed, strict=True))
    try:
        model = CableModel(
            tree=tree,
            membrane=document.membrane.membrane(),
            inputs=tuple(i.synaptic_input(p) for i, p in zip(document.input, placed, strict=True)),
            sites=sites,
            threshold_mV=document.threshold.level_mV if document.threshold else None,
            title=document.title,
            electrodes=tuple(one.electrode() for one in document.electrode),
        )
    except ModelError as error:
        raise ScenarioError(file, [Problem(error.key, shown(error.message, 1000))]) from None
    read = [listed for listed in lists if listed]
    sha256 = hashlib.sha256(b"".join([raw, swc, *(listed.data for listed in read)])).hexdigest()
    list_paths = tuple(listed.path for listed in read)
    return Scenario(Path(path), morphology_path, model, findings, sha256, list_paths, raw.decode("utf-8-sig"))


def _bytes_of(path: str | PathLike[str]) -> bytes:
    try:
        return bytes_of(path, pipes=True)
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or "not the name of a file"
        message = f"cannot be opened ({reason}); check the path, or begin with: cablenoise start FOLDER"
        raise ScenarioError(str(path), [Problem("", message)]) from None


def parse_toml(raw: bytes, file: str) -> dict[str, Any]:
    """The tables of a TOML file.

    Raises:
        ScenarioError: not text, or not TOML; the message has the line.
    """
    try:
        return tomllib.loads(raw.decode("utf-8-sig").replace("\r\n", "\n"))
    except UnicodeDecodeError as error:
        line = raw.count(b"\n", 0, error.start) + 1
        raise ScenarioError(file, [Problem(f"line {line}", "is not UTF-8 text; save the file as UTF-8")]) from None
    except tomllib.TOMLDecodeError as error:
        if file.lower().endswith(".swc"):
            message = "is a reconstruction, expected a scenario; look at it with `cablenoise inspect`"
            raise ScenarioError(file, [Problem("", message)]) from None
        said, _, place = str(error).partition(" (at ")
        last = raw.count(b"\n") + 1
        where = place.removesuffix(")").replace("end of document", f"line {last} (the end)")
        message = f"is not TOML: {shown(said[:1].lower() + said[1:])}; correct this line"
        raise ScenarioError(file, [Problem(where, message)]) from None
    except RecursionError:
        raise ScenarioError(file, [Problem("", "is nested too deeply to be a scenario")]) from None


def _checked(table: dict[str, Any], file: str) -> Document:
    """The document, or all that is wrong with it which can be known without the cell."""
    problems: list[Problem] = []
    document = None
    try:
        document = Document.model_validate(table)
    except ValidationError as error:
        problems += problems_of(error.errors(include_url=False), table, Document)
    problems += _name_problems(table)
    if problems or document is None:
        raise ScenarioError(file, problems)
    return document


def _name_problems(table: dict[str, Any]) -> list[Problem]:
    """Names of inputs and sites that stand twice, and a site with the name of the soma."""
    problems = []
    for section in ("input", "site"):
        entries = table.get(section)
        seen: dict[str, int] = {}
        for i, entry in enumerate(entries if isinstance(entries, list) else []):
            name = entry.get("name") if isinstance(entry, dict) else None
            if not isinstance(name, str):
                continue
            key = f"{section}[{i}].name"
            if name in seen:
                first = f"{section}[{seen[name]}]"
                message = f"found {quoted(name)} again (it names {first}), expected another name; rename one"
                problems.append(Problem(key, message))
            seen.setdefault(name, i)
            if section == "site" and name == "soma":
                message = 'found "soma", expected another name: the soma is always a site; rename this one'
                problems.append(Problem(key, message))
    return problems


def _read_cell(document: Document, path: Path, file: str) -> tuple[bytes, CellTree, tuple[Finding, ...]]:
    """The SWC file's bytes, its tree and the findings."""
    cell = document.cell
    try:
        data = bytes_of(path)
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or "not the name of a file"
        message = (
            f"found {quoted(cell.morphology)}, which cannot be opened as {shown(path)} ({reason}), "
            "expected an SWC file beside the scenario; correct the path"
        )
        raise ScenarioError(file, [Problem("cell.morphology", message)]) from None
    try:
        tree, findings = build_tree(
            read_swc(data, name=path.name), cell.omit, cell.repairs, (cell.shrinkage.xy, cell.shrinkage.z)
        )
    except SwcError as error:
        message = f"{shown(error, 1000)}; see: cablenoise inspect {shown(path)}"
        raise ScenarioError(file, [Problem("cell.morphology", message)]) from None
    return data, tree, findings


def _places(document: Document, tree: CellTree, file: str) -> tuple[tuple[Site, ...], tuple[tuple[Placed, ...], ...]]:
    """Sites and point synapses, each resolved once so that all that name no place are reported together."""
    problems: list[Problem] = []

    def resolved(site: Site, key: str, owner: str) -> Site:
        try:
            site.resolve(tree)
        except PlaceError as error:
            problems.append(Problem(key, f"{shown(error, 1000)} ({owner})"))
        return site

    sites = tuple(
        resolved(s.at.site(s.name), f"site[{i}].at", f"site {quoted(s.name)}") for i, s in enumerate(document.site)
    )
    placed = tuple(
        tuple(
            Placed(resolved(p.site(f"{n.name} {k}"), f"input[{i}].at[{k}]", f"input {quoted(n.name)}"), p.number)
            for k, p in enumerate(n.at or ())
        )
        for i, n in enumerate(document.input)
    )
    for key, zone in _zones(document):
        problems += _zone_problems(zone, key, tree)
    if problems:
        raise ScenarioError(file, problems)
    return sites, placed


def _zones(document: Document) -> Iterable[tuple[str, Zone]]:
    for i, section in enumerate(document.membrane.zone):
        yield f"membrane.zone[{i}].where", section.where.zone()
    for i, entry in enumerate(document.input):
        if entry.where is not None:
            yield f"input[{i}].where", entry.where.zone()


def _zone_problems(zone: Zone, key: str, tree: CellTree) -> list[Problem]:
    try:
        empty = zone.resolve(tree).empty
    except PlaceError as error:
        return [Problem(f"{key}.subtree_of", f"{shown(error, 1000)}; give the SWC id of a point of the cell")]
    if not empty:
        return []
    kinds = choices([kind_name(c) for c in sorted(set(tree.kinds.tolist()))[:8]], "and")
    message = (
        f"selects nothing: no part of the cell passes all its filters; {shown(tree.name)} has {kinds}, "
        f"path_um to {tree.path_um.max():.4g}, branch_order to {tree.branch_order.max()}; widen the filters"
    )
    return [Problem(key, message)]
