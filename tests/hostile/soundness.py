"""What holds for the answer about any passive cell, and for two answers to one question."""

from __future__ import annotations

import random
from dataclasses import replace
from typing import Any

import numpy as np

from cable.network.quadrature import NotConverged
from cable.noise.fluctuations import Fluctuations
from cable.noise.model import CableModel
from cable.theory.kernel import Kernel
from hostile.guards import Defect, clean_refusal
from morphology import CellTree
from tolerances import HOSTILE_ROUND_OFF

TOLERANCE = 1e-6  # of the answers here; asked of the integration, so that it is quick


def sound(model: CableModel, field: Fluctuations) -> None:
    """Check what holds for every passive cell: finite, positive, and the mean between the potentials that pull."""
    for name in ("mean_mV", "input_resistance_MOhm"):
        if not np.isfinite(getattr(field, name)).all():
            raise Defect(f"{name} is not finite")
    if not (field.input_resistance_MOhm > 0).all():
        raise Defect("an input resistance is not positive")
    variance = field.variance_mV2
    if not field.variance_note and not (np.isfinite(variance) & (variance >= 0)).all():
        raise Defect("a variance is neither positive nor declared infinite")
    moving = variance > np.finfo(float).tiny
    if not np.isfinite(field.correlation_time_ms[moving]).all():
        raise Defect("a correlation time is not finite")
    if not np.isfinite(list(field.certificate.as_dict().values())).all():
        raise Defect("the certificate is not finite")
    if model.electrodes or any(one.reversal_mV is None for one in model.inputs):
        return
    pulls = [model.membrane.rest_mV, *(z.rest_mV for z in model.membrane.zones if z.rest_mV is not None)]
    pulls += [one.reversal_mV for one in model.inputs if one.reversal_mV is not None]
    negative = any(one.kernel.area_ms < 0 for one in model.inputs)
    slack = HOSTILE_ROUND_OFF * max(map(abs, pulls))
    low, high = field.mean_mV.min(), field.mean_mV.max()
    if not negative and not (min(pulls) - slack <= low and high <= max(pulls) + slack):
        raise Defect(f"a mean of {low} to {high} mV between pulls of {min(pulls)} to {max(pulls)} mV")


def answer(model: CableModel, draw: random.Random, often: float = 0.2) -> str:
    """Compute and check; now and then also with all potentials 10 mV higher, which may change nothing else."""
    try:
        field = model.fluctuations(TOLERANCE)
    except NotConverged as error:
        clean_refusal(error)
        return "not converged"
    sound(model, field)
    if draw.random() < often and not model.electrodes:
        same_when_shifted(model, field)
    return "answered"


def same_when_shifted(model: CableModel, field: Fluctuations, by_mV: float = 10.0) -> None:
    """Check that potentials count from anywhere: all of them raised raise the mean and leave the rest."""
    zones = tuple(z if z.rest_mV is None else replace(z, rest_mV=z.rest_mV + by_mV) for z in model.membrane.zones)
    membrane = replace(model.membrane, rest_mV=model.membrane.rest_mV + by_mV, zones=zones)
    inputs = tuple(
        one if one.reversal_mV is None else replace(one, reversal_mV=one.reversal_mV + by_mV) for one in model.inputs
    )
    size = abs(model.membrane.rest_mV) + max([abs(one.reversal_mV or 0.0) for one in model.inputs], default=0.0)
    if size > 1e6:
        return  # 10 mV drown in the digits
    level = None if model.threshold_mV is None else model.threshold_mV + by_mV
    other = replace(model, membrane=membrane, inputs=inputs, threshold_mV=level).fluctuations(TOLERANCE)
    near(other.mean_mV - by_mV, field.mean_mV, size, "mean")
    near(other.variance_mV2, field.variance_mV2, None, "variance")
    near(other.input_resistance_MOhm, field.input_resistance_MOhm, None, "input resistance")


def near(found: Any, expected: Any, size: float | None, what: str) -> None:
    """Check that two answers to one question agree, beyond what the integration was asked for."""
    found, expected = np.asarray(found), np.asarray(expected)
    scale = np.maximum(np.abs(expected).max(initial=0.0) if size is None else size, np.finfo(float).tiny)
    apart = np.abs(found - expected)[~(np.isnan(found) & np.isnan(expected))]
    if not (apart <= 4 * TOLERANCE * scale).all():
        raise Defect(f"{what} differs by {apart.max(initial=np.nan) / scale:.2g} between two ways to say one thing")


def model_of(tree: CellTree) -> CableModel:
    """A model for any tree: input on all of its membrane."""
    from cable import Membrane, SynapticInput
    from morphology import Zone

    membrane = Membrane(
        axial_resistivity_ohm_cm=150.0, capacitance_uF_cm2=1.0, resistance_ohm_cm2=15000.0, rest_mV=-70.0
    )
    everywhere = SynapticInput(
        name="all",
        rate_Hz=2.0,
        kernel=Kernel.two_exponential(0.3, 3.0),
        where=Zone(),
        density_per_um2=0.02,
        conductance_nS=0.3,
        reversal_mV=0.0,
    )
    return CableModel(tree, membrane, (everywhere,))
