"""What all tables of a scenario share: strictness, and the values with limits."""

from __future__ import annotations

from typing import Annotated, Any

from pydantic import AfterValidator, BaseModel, ConfigDict, Field

from cable.desk.messages import did_you_mean, quoted
from morphology import KIND_NAMES, kind_code
from morphology.repair import REPAIRS

SMALLEST, LARGEST = (
    1e-15,
    1e15,
)  # no quantity in the trade's units comes near; products of a few stay in double precision


def _bearable(value: float) -> float:
    if value != 0 and not SMALLEST <= abs(value) <= LARGEST:
        raise ValueError(
            f"found {value:g}, expected a size between {SMALLEST:g} and {LARGEST:g}; the key says its unit, correct it"
        )
    return value


Number = Annotated[float, AfterValidator(_bearable)]
Positive = Annotated[float, Field(gt=0), AfterValidator(_bearable)]
NotNegative = Annotated[float, Field(ge=0), AfterValidator(_bearable)]


def _known_kind(kind: object) -> object:
    whole = isinstance(kind, int) and not isinstance(kind, bool)
    if whole or (isinstance(kind, str) and _is_kind(kind)):
        return kind
    raise ValueError(
        f"found {quoted(kind) if isinstance(kind, str) else kind}, expected a kind or its SWC code; "
        f"{did_you_mean(str(kind), KIND_NAMES.values())}"
    )


def _is_kind(word: str) -> bool:
    try:
        kind_code(word)
    except ValueError:
        return False
    return True


def _known_repair(name: str) -> str:
    if name not in REPAIRS:
        raise ValueError(f"found {quoted(name)}, expected a repair that `inspect` names; {did_you_mean(name, REPAIRS)}")
    return name


def _usable_name(name: str) -> str:
    if not name.strip() or not name.isprintable():
        raise ValueError(f"found {quoted(name)}, expected a name that can be read; give one without control characters")
    return name


def _range(limits: list[float]) -> list[float]:
    # nan fails every comparison, so it is refused here too
    if len(limits) != 2 or not limits[0] <= limits[1]:
        raise ValueError(f"found {limits}, expected [from, to] with from <= to (inf is allowed); correct it")
    return limits


def spoken(word: object) -> object:
    """A word however it is joined and capitalised: "dead_time" and "Dead time" are one."""
    return word.strip().lower().replace("_", " ") if isinstance(word, str) else word


Kind = Annotated[Any, AfterValidator(_known_kind)]
Repair = Annotated[str, AfterValidator(_known_repair)]
Range = Annotated[list[Annotated[float, Field(allow_inf_nan=True)]], AfterValidator(_range)]
Name = Annotated[str, Field(min_length=1, max_length=80, description="a name"), AfterValidator(_usable_name)]


class Section(BaseModel):
    """A table of the scenario: unknown keys are errors, text is no number, numbers are finite."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True, allow_inf_nan=False)
