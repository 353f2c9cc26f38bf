"""A recording as a table, a document and sentences."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from cable.desk.messages import DeskError, shown
from cable.desk.tables import Table
from morphology import kind_name

if TYPE_CHECKING:
    from cable.noise.model import CableModel
    from cable.noise.record.clamp import ClampShares
    from cable.noise.record.recorded_pair import RecordedPair
    from cable.noise.record.recordings import RecordedSpectrum, Recording

STAGES = ("true", "loaded", "recorded")


@dataclass(frozen=True, eq=False)
class RecordStudy:
    """All that `record` says of one electrode; `seconds` is None where no length was asked about."""

    recording: Recording
    spectrum: RecordedSpectrum
    wanted_error: float
    seconds: float | None
    assumed: bool
    shares: ClampShares | None
    pair: RecordedPair | None


def study_record(
    model: CableModel,
    site: str,
    other: str | None,
    frequency_Hz: NDArray[np.float64],
    wanted_error: float,
    seconds: float | None,
    tolerance: float,
) -> RecordStudy:
    """Record at `site`, with the correlation with `other` where it is given.

    Raises:
        DeskError: the two cannot be correlated.
    """
    recording = model.recording(site, tolerance)
    try:
        pair = None if other is None else model.recorded_pair(site, other, tolerance)
    except ValueError as error:
        raise DeskError(f"--with: {shown(error, 1000)}") from None
    return RecordStudy(
        recording=recording,
        spectrum=recording.spectrum(frequency_Hz),
        wanted_error=wanted_error,
        seconds=seconds,
        assumed=all(one.site != site for one in model.electrodes),
        shares=model.clamp_shares(site, tolerance) if recording.electrode.clamps else None,
        pair=pair,
    )


def record_table(study: RecordStudy) -> Table:
    """One row per frequency: density in the three stages, as recorded by input, and the power gain."""
    spectrum, unit = study.spectrum, study.recording.electrode.unit
    columns = {"frequency_Hz": spectrum.frequency_Hz}
    columns |= {f"psd_{stage}_{unit}2_per_Hz": getattr(spectrum, stage) for stage in STAGES}
    columns |= {f"psd_recorded_{n}_{unit}2_per_Hz": part for n, part in spectrum.recorded_by_input.items()}
    return Table(columns | {"power_gain": spectrum.power_gain})


def charge_table(model: CableModel, shares: ClampShares) -> Table:
    """One row per point: the share of a synaptic charge there that passes through the clamp."""
    tree = model.tree
    x, y, z = tree.xyz_um.T
    return Table(
        {
            "swc_id": tree.ids,
            "kind": [kind_name(k) for k in tree.kinds.tolist()],
            "x_um": x,
            "y_um": y,
            "z_um": z,
            "radius_um": tree.radius_um,
            "path_um": tree.path_um,
            "charge_share": shares.charge_share,
        }
    )


def record_document(study: RecordStudy) -> dict[str, Any]:
    """All of a recording by key; what is undefined is null."""
    recording = study.recording
    electrode, record, unit = recording.electrode, recording.recorded, recording.electrode.unit
    found: dict[str, Any] = {"site": electrode.site, "mode": electrode.mode, "ideal_electrode_assumed": study.assumed}
    for stage in STAGES:
        one = getattr(recording, stage)
        found |= {
            f"mean_{stage}_{unit}": one.mean,
            f"sd_{stage}_{unit}": one.sd,
            f"correlation_time_{stage}_ms": one.correlation_time_ms,
        }
    found |= {
        f"variance_recorded_by_input_{unit}2": record.variance_by_input,
        "input_resistance_MOhm": recording.input_resistance_MOhm,
        "wanted_error": study.wanted_error,
        "seconds_for_sd": record.seconds_for_sd(study.wanted_error),
        "seconds_for_mean": record.seconds_for_mean(study.wanted_error),
        "shortest_s": record.shortest_s,
    }
    if study.seconds is not None:
        found |= {
            "seconds": study.seconds,
            f"mean_se_{unit}": record.mean_error(study.seconds),
            f"sd_se_{unit}": record.sd * record.sd_relative_error(study.seconds),
            "sd_relative_error": record.sd_relative_error(study.seconds),
            "variance_relative_error": record.variance_relative_error(study.seconds),
        }
    if study.pair is not None:
        one = study.pair.recorded
        found["pair"] = {
            "sites": study.pair.sites,
            **{f"correlation_{stage}": getattr(study.pair, stage).value for stage in STAGES},
            "seconds_for_correlation": one.seconds_for(study.wanted_error),
            "correlation_se": None if study.seconds is None else one.error(study.seconds),
        }
    if study.shares is not None:
        shares = study.shares
        found["clamp"] = {
            "charge_share_by_input": shares.charge_share_by_input,
            "noise_share": shares.noise_share,
            "noise_share_by_input": shares.noise_share_by_input,
            "capacitance_seen_pF": shares.capacitance_seen_pF,
            "capacitance_pF": shares.capacitance_pF,
        }
    errors = {f"{stage}_relative_error": getattr(recording, stage).relative_error for stage in STAGES}
    return {**found, **record_table(study).columns, "certificate": errors}


def record_sentences(study: RecordStudy) -> list[str]:
    """What a person wants to know of a recording first."""
    recording = study.recording
    true, loaded, record, unit = recording.true, recording.loaded, recording.recorded, recording.electrode.unit
    what = "the current of an ideal clamp" if unit == "pA" else "the voltage of the cell without electrodes"
    passing = "with the resistance that is left" if unit == "pA" else "with its electrodes"
    unloaded = study.assumed and (loaded.mean, loaded.sd) == (true.mean, true.sd)
    said = [
        f"At {shown(recording.electrode.site, 60)} {what} is {true.mean:.4g} {unit} with an SD of {true.sd:.4g} {unit}"
        + ("." if unloaded else f"; {passing} it is {loaded.mean:.4g} {unit} with an SD of {loaded.sd:.4g} {unit}."),
        f"The record has an SD of {record.sd:.4g} {unit}"
        + ("" if recording.electrode.keeps_mean else " and has lost the mean")
        + f"; the amplifier shows an input resistance of {recording.input_resistance_MOhm:.4g} MΩ.",
    ]
    if study.assumed:
        said.insert(0, "The scenario has no electrode there: an ideal one is assumed, which neither loads nor filters.")
    if record.variance == 0:
        return [*said, "Nothing fluctuates there: no input reaches it."]
    percent = f"{100 * study.wanted_error:g} %"
    for_mean = record.seconds_for_mean(study.wanted_error)
    said.append(
        f"Its SD is known within {percent} (one standard error) after "
        + _after(record.seconds_for_sd(study.wanted_error), record.shortest_s)
        + (
            ""
            if math.isnan(for_mean)
            else f", its mean within {percent} of the SD after {_after(for_mean, record.shortest_s)}"
        )
        + "."
    )
    if study.seconds is not None:
        error = record.mean_error(study.seconds)
        said.append(
            f"A record of {_time(study.seconds)} knows the SD within "
            f"{100 * record.sd_relative_error(study.seconds):.3g} %"
            + ("" if math.isnan(error) else f" and the mean within {error:.3g} {unit}")
            + "."
        )
        if study.seconds < record.shortest_s:
            said.append(f"That is short: these errors hold for records of at least {_time(record.shortest_s)}.")
    return said + _pair_sentences(study) + _clamp_sentences(study)


def _pair_sentences(study: RecordStudy) -> list[str]:
    if study.pair is None:
        return []
    (a, b), record = (shown(name, 60) for name in study.pair.sites), study.pair.recorded
    known = "" if study.seconds is None else f", within {record.error(study.seconds):.2g} in {_time(study.seconds)}"
    return [
        f"The records at {a} and {b} have a correlation of {record.value:.4f}{known}; without electrodes it is "
        f"{study.pair.true.value:.4f}. It is known within {study.wanted_error:g} after "
        f"{_after(record.seconds_for(study.wanted_error), study.recording.recorded.shortest_s)}."
    ]


def _clamp_sentences(study: RecordStudy) -> list[str]:
    if study.shares is None:
        return []
    shares = study.shares
    parts = ", ".join(f"{shown(n, 30)} {100 * v:.1f} %" for n, v in shares.charge_share_by_input.items())
    noise = "" if math.isnan(shares.noise_share) else f", and {100 * shares.noise_share:.1f} % of the noise"
    return [
        f"Of the synapses' charge the clamp sees: {parts}{noise} that they would make at the clamp itself.",
        f"Its step transient shows {shares.capacitance_seen_pF:.4g} pF of the cell's {shares.capacitance_pF:.4g} pF.",
    ]


def _after(seconds: float, shortest_s: float) -> str:
    """A length; where it is too short for the formulas to hold, what it is at most."""
    return _time(seconds) if seconds >= shortest_s else f"at most {_time(shortest_s)}"


def _time(seconds: float) -> str:
    if seconds < 1:
        return f"{1e3 * seconds:.3g} ms"
    return f"{seconds:.3g} s" if seconds < 600 else f"{seconds / 60:.3g} min"
