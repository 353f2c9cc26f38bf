"""What is known about the exactness of an answer, as numbers and as plain sentences."""

from __future__ import annotations

from dataclasses import asdict, dataclass


@dataclass(frozen=True)
class Certificate:
    """How exact an answer is.

    Attributes:
        tolerance: the relative error of the variance that was asked for.
        quadrature_relative_error: certified bound on the frequency integral's error, relative to the variance.
        refinement_relative_error: how far the division of tapering or unevenly driven cylinders is from
            converged, relative to the variance; 0 where nothing needed dividing.
        frequencies: number of frequency nodes.
        pieces: number of cylinders in the electrical model.
    """

    tolerance: float
    quadrature_relative_error: float
    refinement_relative_error: float
    frequencies: int
    pieces: int

    def as_dict(self) -> dict[str, float | int]:
        """The attributes by name."""
        return asdict(self)

    def sentences(self) -> tuple[str, ...]:
        """The certificate in plain words."""
        division = (
            "every cylinder is exact as it is"
            if self.refinement_relative_error == 0
            else f"dividing tapering and driven cylinders ({self.pieces} pieces) leaves at most "
            f"{self.refinement_relative_error:.0e}"
        )
        return (
            f"Variances are integrated over {self.frequencies} frequencies to a relative error of at most "
            f"{self.quadrature_relative_error:.0e}; {division}.",
        )
