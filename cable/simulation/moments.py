"""Statistics of simulated voltages by batch means: estimates with standard errors, from sums kept batch by batch.

A batch is many correlation times long, so batches are nearly independent; the standard error of a mean over batches
follows from their scatter, that of any other statistic from the scatter of its linear part (delta method).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
POWERS = 4


@dataclass(frozen=True)
class Estimate:
    """A number and its standard error."""

    value: float
    se: float


@dataclass(frozen=True, eq=False)
class Moments:
    """Means over batches of powers of the voltages, from fixed origins, and of their products with the first site's.

    Attributes:
        powers: (batches, POWERS, sites) means of v, v², v³, v⁴.
        products: (batches, sites) means of v·v_first.
        batch_ms: length of a batch.
    """

    powers: Floats
    products: Floats
    batch_ms: float

    @classmethod
    def of(cls, voltages: Floats, batch_ms: float) -> Moments:
        """One batch of voltages (steps, sites)."""
        power, means = np.ones_like(voltages), []
        for _ in range(POWERS):
            power = power * voltages
            means.append(power.mean(axis=0))
        return cls(np.array(means)[None], (voltages * voltages[:, :1]).mean(axis=0)[None], batch_ms)

    @classmethod
    def joined(cls, parts: list[Moments]) -> Moments:
        """All batches of several runs."""
        return cls(
            np.concatenate([one.powers for one in parts]),
            np.concatenate([one.products for one in parts]),
            parts[0].batch_ms,
        )

    @property
    def batches(self) -> int:
        """How many batches there are."""
        return len(self.powers)

    def mean(self, site: int) -> Estimate:
        """Mean from the origin."""
        return self._estimate(float(self.powers[:, 0, site].mean()), self.powers[:, 0, site])

    def sd(self, site: int) -> Estimate:
        """Standard deviation."""
        square = self._central(site)[0]
        variance = self._variance(site)
        sd = float(np.sqrt(variance))
        return self._estimate(sd, square / (2 * sd) if sd > 0 else square)

    def skewness(self, site: int) -> Estimate:
        """Skewness."""
        square, cube = self._central(site)
        sd = float(np.sqrt(square.mean()))
        if sd == 0:
            return Estimate(float("nan"), float("nan"))
        value = float(cube.mean()) / sd**3
        apart = self.powers[:, 0, site] - self.powers[:, 0, site].mean()
        return self._estimate(value, cube / sd**3 - 1.5 * value * square / sd**2 - 3 * apart / sd)

    def correlation(self, site: int) -> Estimate:
        """Correlation with the first site."""
        means = self.powers[:, 0].mean(axis=0)
        product = (
            self.products[:, site]
            - means[0] * self.powers[:, 0, site]
            - means[site] * self.powers[:, 0, 0]
            + means[0] * means[site]
        )
        a, b = self._central(0)[0], self._central(site)[0]
        size = np.sqrt(a.mean() * b.mean())
        if size == 0:
            return Estimate(float("nan"), float("nan"))
        value = float(product.mean() / size)
        return self._estimate(value, product / size - value / 2 * (a / a.mean() + b / b.mean()))

    def correlation_time_ms(self, site: int) -> Estimate:
        """Half the batches' length times the variance of their means over the variance.

        It nears S(0)/(2·variance) as batches grow longer; for comparison the same of the theory is to be taken.
        """
        mean, variance = self.powers[:, 0, site], self._variance(site)
        if variance == 0 or self.batches < 3:
            return Estimate(float("nan"), float("nan"))
        value = self.batch_ms / 2 * float(mean.var(ddof=1)) / variance
        return Estimate(value, value * float(np.sqrt(2 / (self.batches - 1))))

    def _variance(self, site: int) -> float:
        """Unbiased: the mean that is subtracted has itself fluctuated with the voltage."""
        return float(self._central(site)[0].mean()) + self.mean(site).se ** 2

    def _central(self, site: int) -> tuple[Floats, Floats]:
        """(batches,) means of the second and third powers of the distance from the mean over all batches."""
        first, second, third = self.powers[:, 0, site], self.powers[:, 1, site], self.powers[:, 2, site]
        m = first.mean()
        return second - 2 * m * first + m * m, third - 3 * m * second + 3 * m * m * first - m**3

    def _estimate(self, value: float, linear: Floats) -> Estimate:
        if self.batches < 2:
            return Estimate(value, float("nan"))
        return Estimate(value, float(linear.std(ddof=1) / np.sqrt(self.batches)))
