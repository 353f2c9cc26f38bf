"""Columns of numbers as short text inside a page: little-endian bytes in base64, as narrow as they may be."""

from __future__ import annotations

import base64
from typing import Any

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
SINGLE_DIGITS = 1e-6  # relative; what single precision must keep of every value
STEPS_PER_DECADE = 2000  # of values that are kept as logarithms: 0.06 % at worst
NOTHING = -32768  # stands for a value that is 0, undefined or below all decades


def numbers(values: NDArray[Any]) -> dict[str, Any]:
    """A column: single precision, or double where that would lose digits or whole values."""
    column = np.asarray(values, dtype=float)
    with np.errstate(over="ignore", under="ignore", invalid="ignore"):
        narrow = column.astype("<f4")
        kept = np.abs(narrow - column) <= SINGLE_DIGITS * np.abs(column)
    single = bool((kept | ~np.isfinite(column)).all())
    return {"type": "f4" if single else "f8", "bytes": _text(narrow if single else column.astype("<f8"))}


def whole(values: NDArray[Any]) -> dict[str, Any]:
    """A column of whole numbers."""
    column = np.asarray(values, dtype=np.int64)
    fits = bool(np.abs(column).max(initial=0) < 2**31)
    return {"type": "i4" if fits else "f8", "bytes": _text(column.astype("<i4" if fits else "<f8"))}


def logarithms(values: Floats) -> dict[str, Any]:
    """Positive values over some decades as steps of their logarithm, which is all that a curve shows.

    Steps count down from the largest value; 16 decades fit.
    """
    positive = np.isfinite(values) & (values > 0)
    top = float(np.log10(values[positive].max())) if positive.any() else 0.0
    with np.errstate(divide="ignore", invalid="ignore"):
        down = np.rint((np.log10(np.where(positive, values, 1.0)) - top) * STEPS_PER_DECADE)
    steps = np.where(positive & (down > NOTHING), down, NOTHING).astype("<i2")
    return {"type": "i2", "bytes": _text(steps), "top": top, "per_decade": STEPS_PER_DECADE, "nothing": NOTHING}


def _text(array: NDArray[Any]) -> str:
    return base64.b64encode(np.ascontiguousarray(array).tobytes()).decode("ascii")
