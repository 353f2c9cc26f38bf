"""How the desk speaks: errors a person can act on, text made safe to show, the nearest known word."""

from __future__ import annotations

from collections.abc import Iterable


class DeskError(Exception):
    """A person's mistake, or the machine's (disk full): one message that says what to do."""


def shown(text: object, limit: int = 200) -> str:
    """Text from a file as it may be shown: control and direction characters as escapes, cut to `limit`."""
    whole = str(text)
    cut = whole if len(whole) <= limit else whole[: limit - 3] + "..."
    return "".join(c if c.isprintable() else c.encode("unicode_escape").decode("ascii") for c in cut)


def quoted(text: object) -> str:
    """Text from a file in double quotes, safe to show."""
    return f'"{shown(text, 60)}"'


def nearest(word: str, known: Iterable[str]) -> str | None:
    """The known word that looks most like `word`, None where none comes near."""
    from difflib import get_close_matches

    by_lower = {k.lower(): k for k in known}
    found = get_close_matches(word.lower(), by_lower, n=1, cutoff=0.55)
    return by_lower[found[0]] if found else None


def choices(known: Iterable[str], word: str = "or") -> str:
    """A list in English: "a", "a or b", "a, b or c"."""
    items = list(known)
    if len(items) < 2:
        return "".join(items)
    return f"{', '.join(items[:-1])} {word} {items[-1]}"


def did_you_mean(word: str, known: Iterable[str]) -> str:
    """A sentence that names the nearest known word, or all of them where none is near."""
    items = list(known)
    close = nearest(word, items)
    return f"did you mean {quoted(close)}?" if close else f"known are {choices([quoted(k) for k in items], 'and')}"


def percent(share: float) -> str:
    """A share as a person reads it: "4.8 %", "0.0065 %"."""
    return f"{100 * share:.1f} %" if share >= 0.01 else f"{100 * share:.2g} %"


def version() -> str:
    """The version of the program."""
    from cable import __version__

    return __version__
