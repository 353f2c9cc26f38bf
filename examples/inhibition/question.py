"""Will I see dendritic inhibition from the soma?

    python examples/inhibition/question.py

The cell is computed with the inhibition and without it. What matters is the difference at the soma: in the mean,
in the SD, and in what a voltage clamp there would catch of the inhibitory charge; and how long one would have to
record to tell the two SDs apart.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from cable import CableModel, Electrode, load_scenario

HERE = Path(__file__).parent
INHIBITION = "tuft inhibition"
CLAMP = Electrode(site="soma", mode="voltage clamp", series_resistance_MOhm=8.0, holding_mV=0.0)


def answer() -> dict[str, float]:
    """All numbers of the answer, with their units in the names."""
    active = load_scenario(HERE / "scenario.toml")
    silent = replace(active, inputs=tuple(one for one in active.inputs if one.name != INHIBITION))
    found: dict[str, float] = {}
    for site in ("tuft", "soma"):
        with_it, without = (model.fluctuations().at(site) for model in (active, silent))
        found[f"mean_shift_{site}_mV"] = with_it.mean_mV - without.mean_mV
        found[f"sd_change_{site}"] = with_it.sd_mV / without.sd_mV - 1
        found[f"resistance_change_{site}"] = with_it.input_resistance_MOhm / without.input_resistance_MOhm - 1
    clamped = replace(active, electrodes=(CLAMP,))
    found["charge_share"] = clamped.clamp_shares("soma").charge_share_by_input[INHIBITION]
    found["seconds"] = seconds_to_tell_apart(active, silent)
    return found


def seconds_to_tell_apart(active: CableModel, silent: CableModel) -> float:
    """Length of each of two records at the soma whose SDs then differ by two standard errors of the difference, s."""
    a, b = (model.recording("soma").recorded for model in (active, silent))
    # the error of an SD falls with the root of the time
    error_after_1_s = (a.sd * a.sd_relative_error(1.0)) ** 2 + (b.sd * b.sd_relative_error(1.0)) ** 2
    return 4 * error_after_1_s / (a.sd - b.sd) ** 2


def main() -> None:
    found = answer()
    for site in ("tuft", "soma"):
        print(
            f"At the {site} it shifts the mean by {found[f'mean_shift_{site}_mV']:+.2f} mV, changes the SD by "
            f"{100 * found[f'sd_change_{site}']:+.1f} % and the input resistance by "
            f"{100 * found[f'resistance_change_{site}']:+.1f} %."
        )
    print(f"A voltage clamp at the soma, through 8 MΩ, catches {100 * found['charge_share']:.0f} % of its charge.")
    print(f"Two records of {found['seconds'] / 60:.0f} minutes tell the somatic SDs with and without it apart.")


if __name__ == "__main__":
    main()
