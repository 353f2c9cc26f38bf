"""Same synapses, thinner dendrite: how much does an error in the diameters matter?

    python examples/thinner_dendrite/question.py

Diameters near the resolution of the microscope are uncertain. The apical dendrites are made thinner step by step,
with all synapses kept, and the SD is read at the tuft and at the soma.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np

from cable import CableModel, load_scenario

HERE = Path(__file__).parent
FACTORS = (1.2, 1.0, 0.8, 0.6)
APICAL = 4


def thinned(model: CableModel, factor: float) -> CableModel:
    """The same cell with all apical diameters times `factor`."""
    tree = model.tree
    radius = np.where(tree.kinds == APICAL, factor, 1.0) * tree.radius_um
    return replace(model, tree=replace(tree, radius_um=radius))


def answer() -> dict[float, dict[str, float]]:
    """By factor of the diameters: SD at tuft and soma, mV, and input resistance at the tuft, MΩ."""
    model = load_scenario(HERE / "scenario.toml")
    found = {}
    for factor in FACTORS:
        field = thinned(model, factor).fluctuations()
        tuft, soma = field.at("tuft"), field.at("soma")
        found[factor] = {
            "sd_tuft_mV": tuft.sd_mV,
            "sd_soma_mV": soma.sd_mV,
            "tuft_resistance_MOhm": tuft.input_resistance_MOhm,
        }
    return found


def main() -> None:
    print("diameters   SD at tuft   SD at soma   input resistance at tuft")
    for factor, row in answer().items():
        print(
            f"   x {factor:.1f}    {row['sd_tuft_mV']:7.2f} mV   {row['sd_soma_mV']:7.3f} mV"
            f"   {row['tuft_resistance_MOhm']:10.0f} MΩ"
        )


if __name__ == "__main__":
    main()
