"""The program against values from outside it, as one table.

    python tests/accuracy/table.py

Every line compares published closed forms, or numbers computed from them by two routes that share nothing with this
program (25-digit evaluation; frequency quadrature, eigenfunction series or finite volumes), with what the public calls
of `cable` and `morphology` return. Sources as named; formulas and citations from memory unless derived.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, replace

import numpy as np

from cable import CableModel, Electrode, Kernel, Membrane, Placed, SpikeTrain, SynapticInput
from cable.theory.units import BOLTZMANN_J_PER_K, KELVIN_AT_0_C
from morphology import CellTree, Site, Zone

PLAIN = Membrane(axial_resistivity_ohm_cm=150.0, capacitance_uF_cm2=1.0, resistance_ohm_cm2=20000.0, rest_mV=0.0)
LAMBDA_UM, R_INF_MOHM = 816.496580928, 389.848400617
CABLE = "1 3 0 0 0 1 -1\n2 3 500 0 0 1 1\n3 3 1000 0 0 1 2\n"
BALL_AND_STICK = "1 1 0 0 0 10 -1\n2 3 10 0 0 1 1\n3 3 1010 0 0 1 2\n"
TRUNK = 0.5 * 2 ** (2 / 3) * 1.2
Y_TREE = (
    f"1 3 0 0 0 {TRUNK!r} -1\n2 3 400 0 0 {TRUNK!r} 1\n3 3 400 0 0 0.6 2\n4 3 580 240 0 0.6 3\n"
    "5 3 400 0 0 0.6 2\n6 3 580 -240 0 0.6 5\n"
)
LONG = f"1 3 0 0 0 1 -1\n2 3 {40 * LAMBDA_UM!r} 0 0 1 1\n"
RC = f"1 1 0 0 0 {math.sqrt(1e4 / (4 * math.pi))!r} -1\n"  # 100 pF, 200 MΩ
NONE = np.zeros(0)
Pairs = Iterator[tuple[float, float]]


@dataclass(frozen=True)
class Topic:
    """One line of the table: what is compared, with whom, and (want, got) pairs."""

    words: str
    source: str
    pairs: Callable[[], Pairs]

    def worst(self) -> tuple[int, float]:
        """How many values, and the largest relative difference."""
        found = [abs(got / want - 1) for want, got in self.pairs()]
        return len(found), max(found)


def both(want: Iterable[float], got: Iterable[float]) -> Pairs:
    """Pairs of two lists of one length."""
    return zip(want, got, strict=True)


def cell(text: str, *inputs: SynapticInput, sites: tuple[Site, ...] = (), **extra) -> CableModel:
    """A model with the plain membrane."""
    return CableModel(CellTree.from_text(text), PLAIN, inputs, sites, **extra)


def spread(**values) -> SynapticInput:
    """Current synapses over the whole cell: exponential of 2 ms and 20 fC unless said otherwise."""
    usual = dict(name="a", where=Zone(), rate_Hz=1.0, kernel=Kernel.exponential(2.0), current_pA=10.0)
    return SynapticInput(**{**usual, **values})


def ends(text: str, last: int) -> CableModel:
    return cell(text, sites=(Site("end", swc_id=last),))


def steady() -> Pairs:
    still = np.zeros(1)
    model = cell(CABLE, sites=(Site("middle", swc_id=2), Site("end", swc_id=3)))
    root = model.spectrum("soma", still, "end")
    own = abs(root.input_impedance_MOhm[0])
    yield 463.526791954, own
    yield 0.540960099062, abs(root.transfer_impedance_MOhm[0]) / own
    yield 0.645599693246, abs(model.spectrum("soma", still, "middle").transfer_impedance_MOhm[0]) / own
    table = {0.2: (5.06648956344, 0.980327997645), 0.5: (2.16395341374, 0.88681888397)}
    table |= {1.0: (1.3130352855, 0.648054273664), 1.5: (1.10479139298, 0.425096034942)}
    table |= {2.0: (1.03731472073, 0.265802228834)}
    for length, (coth, sech) in table.items():
        one = ends(f"1 3 0 0 0 1 -1\n2 3 {length * LAMBDA_UM!r} 0 0 1 1\n", 2).spectrum("soma", still, "end")
        yield coth * R_INF_MOHM, abs(one.input_impedance_MOhm[0])
        yield sech, abs(one.transfer_impedance_MOhm[0] / one.input_impedance_MOhm[0])


def three_halves() -> Pairs:
    model = cell(Y_TREE, sites=(Site("a", swc_id=4), Site("b", swc_id=6)))
    root, tip = (model.spectrum(a, np.zeros(1), b) for a, b in (("soma", "a"), ("a", "soma")))
    yield 558.120083187, abs(root.input_impedance_MOhm[0])
    yield 0.659768073623, abs(root.transfer_impedance_MOhm[0] / root.input_impedance_MOhm[0])
    yield 743.373777685, abs(tip.input_impedance_MOhm[0])
    yield 0.495349477192, abs(tip.transfer_impedance_MOhm[0] / tip.input_impedance_MOhm[0])
    yield 368.229812135, abs(tip.transfer_impedance_MOhm[0])


def by_frequency() -> Pairs:
    f = np.array([1.0, 10.0, 100.0, 1000.0])
    sealed, open_ = ends(CABLE, 3).spectrum("soma", f, "end"), cell(LONG).spectrum("soma", f)
    yield from both((460.376310283, 316.000687814, 110.143604948, 34.7763463227), abs(sealed.input_impedance_MOhm))
    phases = -5.09853657946, -32.5606690592, -42.6532131696, -44.7720323331
    yield from both(phases, np.degrees(np.angle(sealed.input_impedance_MOhm)))
    yield from both((388.324353108, 307.628923916, 109.800784277, 34.7763461128), abs(open_.input_impedance_MOhm))
    phases = -3.58122790336, -25.744056373, -42.7250673454, -44.7720321488
    yield from both(phases, np.degrees(np.angle(open_.input_impedance_MOhm)))
    ratios = abs(sealed.transfer_impedance_MOhm / sealed.input_impedance_MOhm)
    yield from both((0.540329957387, 0.486760122912, 0.0818497428828, 0.000116959089703), ratios)
    # the delay of the centroid is the phase over ω at low frequency
    slow = ends(f"1 3 0 0 0 1 -1\n2 3 {LAMBDA_UM!r} 0 0 1 1\n", 2).spectrum("soma", np.array([1e-4]))
    yield 20 * 0.775720564772, -np.angle(slow.input_impedance_MOhm[0]) / (2e-3 * math.pi * 1e-4)


def clamped() -> Pairs:
    clamp = Electrode(site="soma", mode="voltage clamp", holding_mV=0.0)
    yield 30.7672145234, cell(CABLE, electrodes=(clamp,)).clamp_shares("soma").capacitance_seen_pF


def shot_noise() -> Pairs:
    def rc(kernel: Kernel, **extra) -> CableModel:
        one = SynapticInput(
            name="a", where=Zone(), count=200.0, spread="area", rate_Hz=5.0, kernel=kernel, charge_fC=20
        )
        return cell(RC, one, **extra)

    kernels = Kernel.impulse(), Kernel.exponential(2.0), Kernel.alpha(2.0), Kernel.two_exponential(0.5, 5.0)
    for kernel, variance in zip(kernels, (0.4, 0.363636363636, 0.347107438017, 0.319290465632), strict=True):
        field = rc(kernel).fluctuations()
        yield variance, field.variance_mV2[0]
        yield 4.0, field.mean_mV[0]
    for kernel, skewness, kurtosis in (
        (kernels[0], 0.210818510678, 0.05),
        (kernels[1], 0.193031072455, 0.0409429280397),
    ):
        (found,) = rc(kernel).excursions()
        yield from ((skewness, found.skewness), (kurtosis, found.excess_kurtosis))
    pair = rc(kernels[1]).pair("soma", "soma", np.array([0.0, 5.0, 20.0, 50.0]), NONE)
    yield from both((0.85621364801, 0.408749890198, 0.091205554025), pair.covariance_mV2[1:] / pair.covariance_mV2[0])
    psd = rc(kernels[1]).spectrum("soma", np.array([0.0, 10.0, 100.0])).psd_mV2_per_Hz
    yield from both((0.032, 0.0122143707637, 7.80754251227e-5), psd)
    yield 6.45774832507, kernels[3].area_ms


def white_noise() -> Pairs:
    """In length constants and membrane time constants; the middle of 40 length constants is far from both ends."""
    where = (
        Site("x", swc_id=2, fraction=0.5),
        Site("half", swc_id=2, fraction=0.5125),
        Site("y", swc_id=2, fraction=0.525),
    )
    one = spread(kernel=Kernel.impulse(), current_pA=None, charge_fC=1.0, density_per_um=1.0)
    model = cell(LONG, one, sites=where)
    unit = 4 * model.fluctuations().at("x").variance_mV2
    near, far = model.pair("x", "half", np.array([40.0]), NONE), model.pair("x", "y", np.array([0.0, 10.0]), NONE)
    yield 0.0111129637324, near.covariance_mV2[0] / unit
    yield from both((0.0919698602929, 0.0614452477139), far.covariance_mV2 / unit)
    yield 0.0393248017626, model.pair("x", "x", np.array([20.0]), NONE).covariance_mV2[0] / unit
    for text, want in (
        (f"1 3 0 0 0 1 -1\n2 3 {LAMBDA_UM!r} 0 0 1 1\n", (0.65651764275, 0.540988353435)),
        (f"1 3 0 0 0 1 -1\n2 3 {2 * LAMBDA_UM!r} 0 0 1 1\n", (0.518657360364, 0.328258821375)),
    ):
        short = cell(text, one, sites=(Site("middle", swc_id=2, fraction=0.5), Site("end", swc_id=2)))
        yield from both(want, (short.fluctuations().at(name).variance_mV2 / unit for name in ("end", "middle")))
    one_lambda = cell(f"1 3 0 0 0 1 -1\n2 3 {LAMBDA_UM!r} 0 0 1 1\n", one, sites=(Site("end", swc_id=2),))
    yield 0.648054273664, one_lambda.pair("soma", "end", np.zeros(1), NONE).correlation


def on_long_cables() -> Pairs:
    where = Site("x", swc_id=2, fraction=0.5), Site("y", swc_id=2, fraction=0.525)
    exponential = cell(LONG, spread(density_per_um=0.5), sites=where)
    at = exponential.fluctuations().at("x")
    yield from ((3.18309886184, at.mean_mV), (0.465503150747, at.sd_mV))
    yield 0.511020609846, exponential.pair("x", "y", np.zeros(1), NONE).correlation
    impulses = spread(density_per_um=0.5, kernel=Kernel.impulse(), current_pA=None, charge_fC=20.0)
    yield 0.556984290688, cell(LONG, impulses, sites=where).fluctuations().at("x").sd_mV
    single = SynapticInput(
        name="p", at=(Placed(where[0]),), rate_Hz=100.0, current_pA=10.0, kernel=Kernel.exponential(2)
    )
    field = cell(LONG, single, sites=where).fluctuations()
    yield from ((0.0727667702786, field.at("x").variance_mV2), (0.00522562735939, field.at("y").variance_mV2))
    jump = replace(single, current_pA=None, charge_fC=20.0, kernel=Kernel.impulse())
    yield 0.00550987823807, cell(LONG, jump, sites=where).fluctuations().at("y").variance_mV2


def spike_trains() -> Pairs:
    f = np.array([0.0, 1.0, 5.0, 10.0, 20.0, 50.0, 200.0])
    table = {
        SpikeTrain.gamma(2): (
            10,
            10.061306856,
            11.3360846428,
            13.8151354184,
            17.1159956086,
            19.3910332154,
            19.9596351192,
        ),
        SpikeTrain.gamma(4): (
            5,
            5.03863610151,
            6.01121794907,
            9.35301719073,
            17.8342091464,
            20.0802431508,
            20.0006307781,
        ),
        SpikeTrain.dead_time(10): (12.8, 12.8028635876, 12.8716407284, 13.0871608497, 13.9556664931, 19.5059095394, 20),
    }
    for train, want in table.items():
        yield from both(want, 20 * train.spectrum_over_rate(2e-3 * math.pi * f, 20.0))
    one = SynapticInput(name="a", where=Zone(), count=1, spread="area", rate_Hz=20.0, charge_fC=20.0)
    for train, variance in ((SpikeTrain.gamma(2), 0.00553846153846), (SpikeTrain.dead_time(10), 0.00565457065693)):
        yield variance, cell(RC, replace(one, spike_train=train)).fluctuations().variance_mV2[0]


def conductances() -> CableModel:
    radius = math.sqrt(34636 / (4 * math.pi))
    resting = replace(PLAIN, resistance_ohm_cm2=1000 / 0.045, rest_mV=-80.0)
    every = dict(where=Zone(), count=1000.0, spread="area")
    pair = (
        SynapticInput(
            name="e",
            rate_Hz=3.69623655914,
            conductance_nS=1.2,
            reversal_mV=0.0,
            kernel=Kernel.exponential(2.728),
            **every,
        ),
        SynapticInput(
            name="i",
            rate_Hz=9.10390848427,
            conductance_nS=0.6,
            reversal_mV=-75.0,
            kernel=Kernel.exponential(10.49),
            **every,
        ),
    )
    return CableModel(CellTree.from_text(f"1 1 0 0 0 {radius!r} -1\n"), resting, pair)


def in_vivo_like() -> Pairs:
    at = conductances().fluctuations().at("soma")
    yield from ((-65.2387799431, at.mean_mV), (1.37066238059, at.sd_mV), (11.7666162271, at.input_resistance_MOhm))


def crossings() -> Pairs:
    kernels = {25.1646060522: Kernel.exponential(2.0), 17.3652279511: Kernel.alpha(2.0)}
    kernels |= {15.005271936: Kernel.two_exponential(0.5, 5.0)}
    for rate, kernel in kernels.items():
        one = SynapticInput(
            name="a", where=Zone(), count=200.0, spread="area", rate_Hz=5.0, kernel=kernel, charge_fC=20
        )
        yield rate, cell(RC, one, threshold_mV=4.0).excursions()[0].upcrossing_Hz
    one = replace(one, kernel=Kernel.exponential(2.0))
    for sds, rate in ((2, 3.40565908762), (3, 0.279553521521)):
        level = 4 + sds * 0.603022689156
        yield rate, cell(RC, one, threshold_mV=level).excursions()[0].upcrossing_Hz
    model = cell(BALL_AND_STICK, spread(density_per_um2=0.08), sites=(Site("tip", swc_id=3),), threshold_mV=3.2)
    yield from both((37.3753365578, 48.5831397932), (one.upcrossing_Hz for one in model.excursions()))


def spines() -> Pairs:
    spiny = replace(PLAIN, resistance_ohm_cm2=20000 / 1.5, capacitance_uF_cm2=1.5)
    for text, membrane in (
        (CABLE, spiny),
        (f"1 3 0 0 0 {1.14471424255!r} -1\n2 3 {1310.3706971!r} 0 0 1.14471424255 1\n", PLAIN),
    ):
        model = CableModel(CellTree.from_text(text), membrane)
        yield 351.666022557, abs(model.spectrum("soma", np.zeros(1)).input_impedance_MOhm[0])


def geometry() -> Pairs:
    frustum = CellTree.from_text("1 3 0 0 0 1 -1\n2 3 50 0 0 0.5 1\n")
    yield 235.631229697, frustum.shape.area_um2.sum()
    three = CellTree.from_text("1 1 0 0 0 10 -1\n2 1 0 -10 0 10 1\n3 1 0 10 0 10 1\n")
    for sphere in (CellTree.from_text("1 1 0 0 0 10 -1\n"), three):
        yield 1256.63706144, sphere.shape.sphere_area_um2.sum() + sphere.shape.area_um2.sum()
    yield 13.0, CellTree.from_text("1 3 0 0 0 1 -1\n2 3 3 4 12 1 1\n").path_um[-1]
    file = f"1 3 0 0 0 {TRUNK!r} -1\n2 3 400 0 0 {TRUNK!r} 1\n3 3 580 240 0 0.6 2\n4 3 580 -240 0 0.6 2\n"
    yield 5320.02806052, CellTree.from_text(file).shape.area_um2.sum()


def thermal() -> Pairs:
    body, kt = 37.0, BOLTZMANN_J_PER_K * (KELVIN_AT_0_C + 37.0) * 1e18
    leak = SynapticInput(
        name="leak", where=Zone(), density_per_um2=1.0, rate_Hz=1e3, charge_fC=math.sqrt(2 * kt * 10 / 20000.0)
    )
    yield 3.4256662988e-6, cell(RC).spectrum("soma", np.zeros(1)).thermal_mV2_per_Hz(body)[0]
    yield 6.54376258241e-3, cell(RC, leak).fluctuations().sd_mV[0]
    model = cell(LONG, leak, sites=(Site("x", swc_id=2, fraction=0.5),))
    found = model.spectrum("x", np.array([1.0, 10.0, 100.0]))
    yield from both((3.31917990424e-6, 2.37308487614e-6, 6.90799425725e-7), found.thermal_mV2_per_Hz(body))
    shares = found.psd_mV2_per_Hz / found.thermal_mV2_per_Hz(body)
    yield from both((0.498041512433, 0.383734406326, 0.0734964650422), shares)
    yield 6.46019186933e-3, model.fluctuations().at("x").sd_mV


def worked() -> Pairs:
    sphere = cell("1 1 0 0 0 10 -1\n", spread(count=200.0, spread="area", rate_Hz=5.0, current_pA=5.0))
    at = sphere.fluctuations().at("soma")
    yield from ((15.9154943092, at.mean_mV), (2.39935104439, at.sd_mV))
    yield 0.193371016129, sphere.spectrum("soma", np.array([10.0])).psd_mV2_per_Hz[0]
    three = Site("middle", swc_id=2), Site("end", swc_id=3)
    cable = cell(CABLE, spread(density_per_um=0.5), sites=three)
    yield from both((0.741982656795, 0.686722585262, 0.741982656795), (s.sd_mV for s in cable.fluctuations().sites))
    yield 0.713188495026, cable.pair("soma", "end", np.zeros(1), NONE).correlation
    late = spread(kernel=Kernel.two_exponential(0.5, 5.0), current_pA=None, charge_fC=20.0, density_per_um=1.0)
    distal = cell(CABLE, replace(late, where=Zone(path_um=(500.0, 1000.0))), sites=three)
    found = distal.fluctuations().sites
    yield from both((0.524479935894, 0.639824773561, 0.798159338449), (s.sd_mV for s in found))
    yield from both((2.66717827415, 3.69901944953), (found[0].mean_mV, found[2].mean_mV))
    pair = distal.pair("soma", "end", np.array([5.0, -5.0]), NONE)
    yield from both((0.295689184648, 0.393038591831), pair.covariance_mV2)
    yield 0.866379924789, pair.correlation
    ball = spread(density_per_um2=0.08)
    stick = cell(BALL_AND_STICK, ball, sites=(Site("mid", swc_id=3, fraction=0.5), Site("tip", swc_id=3)))
    yield from both((0.685974913407, 0.637080987142, 0.710358491895), (s.sd_mV for s in stick.fluctuations().sites))
    pair = stick.pair("soma", "tip", np.zeros(1), np.array([1.0]))
    yield 0.630294846558, pair.correlation
    psd = stick.spectrum("soma", np.array([0.0, 1.0, 10.0, 100.0])).psd_mV2_per_Hz
    yield from both((0.0357386935455, 0.035204475923, 0.0146399174194, 0.000221291836504), psd)
    lagged = stick.pair("soma", "soma", np.array([0.0, 5.0, 20.0]), NONE).covariance_mV2
    yield from both((0.778135918011, 0.336417328441), lagged[1:] / lagged[0])
    common = cell(BALL_AND_STICK, replace(ball, correlation=0.1)).fluctuations().at("soma")
    yield 4.86787763778, common.sd_mV
    tips = Site("branch", swc_id=2), Site("a", swc_id=4), Site("b", swc_id=6)
    y = cell(Y_TREE, spread(density_per_um2=0.1), sites=tips)
    yield from both(
        (0.92873373518, 0.888629595374, 1.00049806381, 1.00049806381), (s.sd_mV for s in y.fluctuations().sites)
    )
    yield 0.771183690591, y.pair("soma", "a", np.zeros(1), NONE).correlation
    yield 0.72337557221, y.pair("a", "b", np.zeros(1), NONE).correlation


TOPICS = (
    Topic("steady state of cables", "Rall 1959, 1977", steady),
    Topic("3/2 law, injection at one tip", "Rall 1962; Rall & Rinzel 1973", three_halves),
    Topic("impedance and attenuation by frequency, delay", "Rall & Rinzel 1973; Agmon-Snir & Segev 1993", by_frequency),
    Topic("capacitance seen by a clamp", "Taylor 2012 (abstract); derived", clamped),
    Topic("shot noise on an isopotential cell", "Campbell 1909; Rice 1944", shot_noise),
    Topic("white noise in space and time", "Wan & Tuckwell 1979; Tuckwell & Walsh 1983", white_noise),
    Topic("Poisson synapses on long cables", "derived by two routes", on_long_cables),
    Topic("gamma and dead-time trains", "Bartlett 1963; Cox & Lewis 1966", spike_trains),
    Topic("conductances in vivo", "Destexhe et al. 2001; Richardson 2004", in_vivo_like),
    Topic("level crossings", "Rice 1945", crossings),
    Topic("spines folded into membrane or length", "Stratford et al. 1989", spines),
    Topic("areas and lengths from SWC", "Cannon et al. 1998; elementary", geometry),
    Topic("thermal noise", "Johnson 1928; Nyquist 1928", thermal),
    Topic("worked cells: sphere, cable, ball and stick, Y tree", "derived by two to four routes", worked),
)


def table() -> str:
    """The comparison as Markdown."""
    lines = ["| outside values | source | values | worst relative difference |", "|---|---|---|---|"]
    total, worst = 0, 0.0
    for topic in TOPICS:
        count, apart = topic.worst()
        total, worst = total + count, max(worst, apart)
        lines.append(f"| {topic.words} | {topic.source} | {count} | {rounded(apart)} |")
    lines.append(f"| all | | {total} | {rounded(worst)} |")
    return "\n".join(lines)


def rounded(apart: float) -> str:
    """The next power of ten above a difference, as its digits change from machine to machine."""
    return f"below 1e{math.ceil(math.log10(max(apart, 1e-16)))}"


if __name__ == "__main__":
    print(table())
