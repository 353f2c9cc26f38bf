"""Arguments and options which several commands have, worded once."""

from __future__ import annotations

from typing import Annotated

import typer

ScenarioArgument = Annotated[str, typer.Argument(metavar="SCENARIO", help="The scenario (TOML).")]
SiteArgument = Annotated[str, typer.Argument(metavar="SITE", help="A site of the scenario.")]
Force = Annotated[bool, typer.Option("--force", help="Replace an existing file.")]
Tolerance = Annotated[
    float, typer.Option(min=1e-13, max=1e-2, help="Relative error allowed in the integration over frequency.")
]
Quantity = Annotated[
    str | None,
    typer.Option(
        metavar="WORD",
        help="mean, sd, variance, correlation-time, input-resistance, share; "
        "map: also correlation, lag, source, charge-share.",
    ),
]
ShareInput = Annotated[
    list[str] | None,
    typer.Option("--input", metavar="NAME", help="An input whose share of the variance is shown; repeatable."),
]
NextOrder = Annotated[
    bool, typer.Option("--next-order", help="Beyond the linear theory: mean and SD to the next order as well.")
]
