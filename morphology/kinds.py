"""The kinds of neurite, by the codes of the SWC standard and the words of the trade."""

from __future__ import annotations

SOMA, AXON, BASAL, APICAL = 1, 2, 3, 4
KIND_NAMES = {SOMA: "soma", AXON: "axon", BASAL: "basal", APICAL: "apical"}
_CODES = {name: code for code, name in KIND_NAMES.items()}


def kind_name(code: int) -> str:
    """The word for an SWC code, or the number itself as text where the standard has no word we use."""
    return KIND_NAMES.get(int(code), str(int(code)))


def kind_code(kind: str | int) -> int:
    """The SWC code of a kind given as a word ("basal") or a number (3, "3").

    Raises:
        ValueError: the word is neither a kind nor a whole number.
    """
    if isinstance(kind, str) and kind.strip().lower() in _CODES:
        return _CODES[kind.strip().lower()]
    try:
        return int(kind)
    except ValueError:
        words = ", ".join(KIND_NAMES.values())
        raise ValueError(f"unknown kind {kind!r}: expected {words}, or an SWC code such as 7") from None
