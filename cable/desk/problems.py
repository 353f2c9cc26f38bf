"""What is wrong in a scenario, by key, in the words of the trade: found, expected, what to do."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from cable.desk.messages import DeskError, did_you_mean, quoted, shown

SHOWN_PROBLEMS = 5


@dataclass(frozen=True)
class Problem:
    """One thing to correct: the key path ("" for the file as a whole) and what to say about it."""

    key: str
    message: str


class ScenarioError(DeskError, ValueError):
    """A scenario that cannot be used.

    Attributes:
        file: the scenario's name as given.
        problems: all that was found.
    """

    def __init__(self, file: str, problems: Iterable[Problem]) -> None:
        self.file = file
        self.problems = tuple(problems)
        super().__init__(file, self.problems)

    def __str__(self) -> str:
        lines = [": ".join(p for p in (shown(self.file), x.key, x.message) if p) for x in self.problems]
        more = len(lines) - SHOWN_PROBLEMS
        return "\n".join(lines[:SHOWN_PROBLEMS] + ([f"and {more} more in {shown(self.file)}"] if more > 0 else []))


def key_path(location: Sequence[str | int]) -> str:
    """`("input", 1, "kernel")` as input[1].kernel; items of a list count from 0."""
    path = ""
    for part in location:
        path += f"[{part}]" if isinstance(part, int) else f".{shown(part, 60)}" if path else shown(part, 60)
    return path


def problems_of(errors: Iterable[Mapping[str, Any]], document: Mapping[str, Any], schema: type) -> list[Problem]:
    """The errors of pydantic in our words.

    Args:
        errors: as `ValidationError.errors()` lists them.
        document: the TOML document, to name the input or site that is meant.
        schema: the model of the whole document, to know which keys there are.
    """
    problems = []
    for error in errors:
        location = [part for part in error["loc"] if not str(part).startswith("function-")]
        message = _sentence(error, location, schema)
        problems.append(Problem(key_path(location), message + _owner(location, document)))
    return list(dict.fromkeys(problems))


def _sentence(error: Mapping[str, Any], location: Sequence[str | int], schema: type) -> str:
    kind, found, limits = error["type"], error.get("input"), error.get("ctx") or {}
    if kind == "value_error":
        return str(limits.get("error", error["msg"]))
    section, field = _section_and_field(schema, location)
    about = f", {field.description}" if field is not None and field.description else ""
    if kind == "extra_forbidden":
        known = list(section.model_fields) if section is not None else []
        return f"found an unknown key, {did_you_mean(str(location[-1]), known)}"
    if kind == "missing":
        return f"found nothing, expected this key{about}; add it"
    said = _described(found)
    if kind == "finite_number":
        return f"found {said}, expected a finite number{about}; correct it"
    if kind in ("greater_than", "greater_than_equal", "less_than", "less_than_equal"):
        words = {"gt": "above", "ge": "of at least", "lt": "below", "le": "of at most"}
        bound = " and ".join(f"{words[k]} {v:g}" for k, v in limits.items() if k in words)
        return f"found {said}, expected a number {bound}{about}; correct it"
    if kind in ("float_type", "int_type", "float_parsing", "int_from_float", "int_parsing"):
        number = "a whole number" if kind.startswith("int") else "a number"
        remedy = "write the number without quotes; the key says its unit" if isinstance(found, str) else "correct it"
        return f"found {said}, expected {number}{about}; {remedy}"
    expected = {
        "string_type": "text in quotes",
        "list_type": "a list in square brackets",
        "tuple_type": "a list in square brackets",
        "dict_type": "a table of keys",
        "model_type": "a table of keys",
        "bool_type": "true or false",
        "too_short": "at least one entry",
        "string_too_short": "some text",
        "string_too_long": "a shorter text (at most 80 characters)",
        "literal_error": str(limits.get("expected", "")).replace("'", '"'),
    }.get(kind, str(error["msg"]))
    return f"found {said}, expected {expected}{about}; correct it"


def _described(found: Any) -> str:
    """A value of the document as a person wrote it."""
    if isinstance(found, bool):
        return str(found).lower()
    if isinstance(found, str):
        return quoted(found)
    if isinstance(found, Mapping):
        return "a table with " + (", ".join(shown(k, 30) for k in list(found)[:4]) or "no keys")
    if isinstance(found, list):
        return "an empty list" if not found else f"the list {shown(found, 60)}"
    return shown(found, 60)


def _section_and_field(schema: Any, location: Sequence[str | int]) -> tuple[Any, Any]:
    """The model that owns the last key of a location, and the key's field (None where there is none)."""
    section, field = schema, None
    for part in location:
        if isinstance(part, int):
            continue
        if field is not None:
            inner = _model_in(field.annotation)
            if inner is None:
                return None, field
            section = inner
        field = section.model_fields.get(part)
        if field is None:
            return section, None
    return section, field


def _model_in(annotation: Any) -> Any:
    """The pydantic model inside an annotation such as list[Model] or Model | None."""
    from typing import get_args

    if hasattr(annotation, "model_fields"):
        return annotation
    found = (_model_in(a) for a in get_args(annotation))
    return next((m for m in found if m is not None), None)


def _owner(location: Sequence[str | int], document: Mapping[str, Any]) -> str:
    """Which input or site is meant, by its name: counting from 0 is for programs."""
    if len(location) > 1 and location[0] in ("input", "site") and isinstance(location[1], int):
        try:
            name = document[str(location[0])][location[1]]["name"]
        except (KeyError, IndexError, TypeError):
            return ""
        if isinstance(name, str) and name:
            return f" ({location[0]} {quoted(name)})"
    return ""
