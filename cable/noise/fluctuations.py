"""The main answer: mean, variance and their companions at every point of the cell, in one sweep per frequency."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from cable.noise.certificate import Certificate
from cable.noise.integral import DERIVATIVE_FINITE_ABOVE, VARIANCE_FINITE_ABOVE, integrate_spectra
from cable.noise.operating_point import OperatingPoint
from cable.noise.population import Source, shared_spectrum
from cable.noise.steepness import falls_as
from cable.theory.units import MOHM_PER_GOHM
from morphology import kind_name

if TYPE_CHECKING:
    from cable.noise.model import CableModel

Floats = NDArray[np.float64]
VARIANCE_NOTE = (
    "no SD where point synapses whose charge comes at once sit on a neurite: the variance is infinite there, as each "
    "event begins with an infinite voltage; give them a kernel, or spread them over a zone"
)


@dataclass(frozen=True)
class SiteFluctuations:
    """What the voltage does at one site; names and units as in `Fluctuations`."""

    name: str
    swc_id: int
    kind: str
    xyz_um: tuple[float, float, float]
    radius_um: float
    path_um: float
    branch_order: int
    mean_mV: float
    sd_mV: float
    variance_mV2: float
    variance_by_input_mV2: dict[str, float]
    correlation_time_ms: float
    input_resistance_MOhm: float
    upcrossing_Hz: float | None


@dataclass(frozen=True, eq=False)
class Fluctuations:
    """Voltage statistics of a model. Arrays are (P,): the N points of the tree, then the model's sites.

    The public properties give the N points; `at` and `sites` give the sites.

    Attributes:
        model: the model.
        certificate: how exact the numbers are.
        upcrossing_note: why upcrossing rates are undefined at some points ("" where none is).
        variance_note: why the variance is infinite, and given as NaN, at some points ("" where it is not).
    """

    model: CableModel
    certificate: Certificate
    upcrossing_note: str
    variance_note: str
    _mean: Floats
    _by_input: Floats
    _still: Floats
    _resistance: Floats
    _derivative: Floats | None

    def _points(self, values: Floats) -> Floats:
        return values[: len(self.model.tree)]

    @cached_property
    def _variance(self) -> Floats:
        return self._by_input.sum(axis=1)

    @property
    def mean_mV(self) -> Floats:
        """(N,) mean voltage, mV."""
        return self._points(self._mean)

    @property
    def variance_mV2(self) -> Floats:
        """(N,) variance of the voltage, mV²; NaN where it is infinite."""
        return self._points(self._variance)

    @property
    def sd_mV(self) -> Floats:
        """(N,) standard deviation of the voltage, mV; NaN where it is infinite."""
        return np.sqrt(self.variance_mV2)

    @property
    def variance_by_input_mV2(self) -> dict[str, Floats]:
        """Per input, (N,) the part of the variance that it makes, mV²; the parts add up.

        Where inputs share spikes there is one more part, "shared": see `CableModel.part_names`.
        """
        return {name: self._points(self._by_input[:, k]) for k, name in enumerate(self.model.part_names)}

    @cached_property
    def _correlation_time(self) -> Floats:
        with np.errstate(divide="ignore", invalid="ignore"):
            return self._still / (2 * self._variance)

    @property
    def correlation_time_ms(self) -> Floats:
        """(N,) S(0)/(2·variance), the area of the normalised autocorrelation over positive lags, ms."""
        return self._points(self._correlation_time)

    @property
    def input_resistance_MOhm(self) -> Floats:
        """(N,) steady input resistance at the operating point, synaptic conductances included, MΩ."""
        return self._points(self._resistance)

    @cached_property
    def _upcrossing(self) -> Floats | None:
        if self._derivative is None or self.model.threshold_mV is None:
            return None
        with np.errstate(divide="ignore", invalid="ignore"):
            distance = (self.model.threshold_mV - self._mean) ** 2 / (2 * self._variance)
            return 1e3 / (2 * np.pi) * np.sqrt(self._derivative / self._variance) * np.exp(-distance)

    @property
    def upcrossing_Hz(self) -> Floats | None:
        """(N,) rate of upward crossings of the model's threshold, Hz; NaN where undefined, None without threshold.

        Rice's formula for a stationary Gaussian voltage (Rice 1945, Bell Syst Tech J 24:46; from memory).
        """
        return None if self._upcrossing is None else self._points(self._upcrossing)

    def to_numpy(self) -> NDArray[np.void]:
        """(N,) a structured array: all answers at the points of the tree, named as in the files of `table`."""
        from cable.noise.columns import columns, structured

        return structured(columns(self))

    def to_pandas(self) -> Any:
        """The same as a pandas DataFrame.

        Raises:
            ImportError: pandas is not installed.
        """
        from cable.noise.columns import columns, data_frame

        return data_frame(columns(self))

    def _repr_html_(self) -> str:
        """The answer as a notebook shows it: sites, certificate, a small map."""
        from cable.noise.cards import field_card

        return field_card(self)

    @cached_property
    def sites(self) -> tuple[SiteFluctuations, ...]:
        """All sites, "soma" first."""
        return tuple(self._site(k, name) for k, name in enumerate(self.model.site_names))

    def at(self, site: str) -> SiteFluctuations:
        """What the voltage does at a named site.

        Raises:
            KeyError: the model has no such site.
        """
        if site not in self.model.site_names:
            raise KeyError(f"no site {site!r}; the sites are {', '.join(self.model.site_names)}")
        return self.sites[self.model.site_names.index(site)]

    def _site(self, index: int, name: str) -> SiteFluctuations:
        tree, place = self.model.tree, self.model.site_places[name]
        at, parent = len(tree) + index, max(int(tree.parent[place.row]), 0)
        share = place.fraction

        def between(values: Floats) -> Floats:
            return values[parent] + share * (values[place.row] - values[parent])

        on_cable = tree.shape.far[place.row] > tree.shape.near[place.row]
        radius = (
            tree.shape.radius_at(np.full(len(tree), share))[place.row]
            if on_cable and share < 1
            else tree.radius_um[place.row]
        )
        return SiteFluctuations(
            name=name,
            swc_id=int(tree.ids[place.row]),
            kind=kind_name(tree.kinds[place.row] if share == 1 else tree.shape.kind[place.row]),
            xyz_um=tuple(between(tree.xyz_um).tolist()),
            radius_um=float(radius),
            path_um=float(between(tree.path_um)),
            branch_order=int(tree.branch_order[place.row]),
            mean_mV=float(self._mean[at]),
            sd_mV=math.sqrt(self._variance[at]),
            variance_mV2=float(self._variance[at]),
            variance_by_input_mV2={name: float(self._by_input[at, k]) for k, name in enumerate(self.model.part_names)},
            correlation_time_ms=float(self._correlation_time[at]),
            input_resistance_MOhm=float(self._resistance[at]),
            upcrossing_Hz=None if self._upcrossing is None else float(self._upcrossing[at]),
        )


def fluctuations(model: CableModel, tolerance: float = 1e-9) -> Fluctuations:
    """Voltage statistics at all points and sites of `model`; see `CableModel.fluctuations`."""
    refined = model.refined
    point = refined.point
    layout = point.layout
    nodes = np.r_[layout.row_node, [layout.node_at(place) for place in model.site_places.values()]].astype(np.int64)
    power = falls_as(point)[nodes]
    infinite = power <= VARIANCE_FINITE_ABOVE
    rough = power <= DERIVATIVE_FINITE_ABOVE
    wants_derivative = model.threshold_mV is not None
    count = len(model.part_names)

    def spectra(seen: OperatingPoint, omega: Floats) -> Floats:
        response = point.network.at(omega)
        values = np.empty((len(nodes), count + wants_derivative, len(omega)))
        for k, source in enumerate(seen.sources):
            values[:, k] = source.spectrum(response)[nodes]
        if count > len(seen.sources):
            values[:, count - 1] = shared_spectrum(seen.sources, response)[nodes]
        values[infinite] = 0.0
        if wants_derivative:
            values[:, count] = np.where(rough[:, None], 0.0, omega**2 * values[:, :count].sum(axis=1))
        return values

    def scale(integrals: Floats) -> Floats:
        size = np.repeat(integrals[:, :count].sum(axis=1)[:, None], integrals.shape[1], axis=1)
        size[:, count:] = integrals[:, count:]
        return size

    resistance = point.steady.input_impedance_GOhm()[nodes, 0].real * MOHM_PER_GOHM
    if count:
        powers = np.where(infinite, np.inf, power)
        result = integrate_spectra(point, spectra, scale, tolerance, powers, wants_derivative)
        error, used = result.relative_error, len(result.found.omega_per_ms)
        by_input = np.where(infinite[:, None], np.nan, result.value[:, :count])
        still = result.at_zero[:, :count].sum(axis=1)
        derivative = np.where(rough, np.nan, result.value[:, -1]) if wants_derivative else None
    else:
        by_input, error, used, derivative = np.zeros((len(nodes), 0)), 0.0, 0, None
        still = np.zeros(len(nodes))
    return Fluctuations(
        model=model,
        certificate=Certificate(tolerance, error, refined.relative_error, used, len(layout.row)),
        upcrossing_note=_upcrossing_note(point.sources, rough) if wants_derivative else "",
        variance_note=VARIANCE_NOTE if infinite.any() else "",
        _mean=point.mean_mV[nodes],
        _by_input=by_input,
        _still=still,
        _resistance=resistance,
        _derivative=derivative,
    )


def _upcrossing_note(sources: tuple[Source, ...], rough: NDArray[np.bool_]) -> str:
    if not rough.any():
        return ""
    at_once = any(source.population.kernel.is_impulse for source in sources)
    cause = (
        "synapses sit whose charge comes at once, or point synapses on a neurite"
        if at_once
        else "point synapses sit on a neurite"
    )
    return (
        f"no upcrossing rate where {cause} whose kernel jumps at t = 0: the voltage is "
        "too rough there for its derivative to have a variance"
    )
