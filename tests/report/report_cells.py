"""What the checks of the report in a browser need beside the browser."""

from __future__ import annotations

from collections.abc import Sequence


def contrast(one: Sequence[int], other: Sequence[int]) -> float:
    """Contrast ratio of two sRGB colours by the Web Content Accessibility Guidelines 2.1 (W3C 2018), from memory."""

    def luminance(colour: Sequence[int]) -> float:
        linear = [v / 12.92 if v <= 0.04045 else ((v + 0.055) / 1.055) ** 2.4 for v in (c / 255 for c in colour)]
        return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]

    high, low = sorted((luminance(one), luminance(other)), reverse=True)
    return (high + 0.05) / (low + 0.05)
