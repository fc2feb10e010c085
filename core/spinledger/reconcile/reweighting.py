"""Conformer populations changed as little as measured averages ask for."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from spinledger.reconcile.coarse import FloatArray
from spinledger.values.arrays import locked_floats

MOST_STEPS = 100
CONVERGED = 1e-10


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Reweighted:
    """Populations after reweighting, and how sure averages over them are.

    Attributes
    ----------
    weights : numpy.ndarray, shape (n_conformers,)
    prior : numpy.ndarray, shape (n_conformers,)
    values : numpy.ndarray, shape (n_conformers, n_averages)
    sds : numpy.ndarray, shape (n_averages,)
    deviations : numpy.ndarray, shape (n_averages,)
        Reweighted average minus measured value, in sd.
    relative_entropy : float
        Of the weights to the prior.
    log_evidence : float
        ln probability density of the measured values.
    trust : float
    """

    weights: FloatArray
    prior: FloatArray
    values: FloatArray
    sds: FloatArray
    deviations: FloatArray
    relative_entropy: float
    log_evidence: float
    trust: float

    def __post_init__(self) -> None:
        for name, ndim in (
            ("weights", 1),
            ("prior", 1),
            ("values", 2),
            ("sds", 1),
            ("deviations", 1),
        ):
            owned = locked_floats(getattr(self, name), name, ndim=ndim)
            object.__setattr__(self, name, owned)

    def mean_and_sd(self, observable: FloatArray) -> tuple[float, float]:
        """Average of an observable and the sd that the populations leave to it.

        Parameters
        ----------
        observable : numpy.ndarray, shape (n_conformers,)
        """
        mean = float(self.weights @ observable)
        centred = observable - mean
        together = (self.weights * centred) @ (self.values - self.weights @ self.values)
        own = float(self.weights @ centred**2)
        noise = self.trust * np.square(self.sds)
        told = together @ np.linalg.solve(
            covariance(self.values, self.weights) + np.diag(noise), together
        )
        return mean, float(np.sqrt(max(own - float(told), 0.0) / self.trust))


def covariance(values: FloatArray, weights: FloatArray) -> FloatArray:
    """Covariance of the columns over weighted rows, shape (n_columns, n_columns)."""
    centred = values - weights @ values
    return np.asarray((centred * weights[:, None]).T @ centred)


def reweighted(
    values: FloatArray,
    prior: FloatArray,
    measured: FloatArray,
    sds: FloatArray,
    *,
    trust: float,
) -> Reweighted:
    """Weights that agree with measured averages and stay close to the prior.

    Parameters
    ----------
    values : numpy.ndarray, shape (n_conformers, n_averages)
        What each conformer alone would show.
    prior : numpy.ndarray, shape (n_conformers,)
        Weights beforehand, > 0, sum 1.
    measured, sds : numpy.ndarray, shape (n_averages,)
        Measured averages, and sd of measurement and rule together.
    trust : float
        Weight of the relative entropy: how many times sharper than one draw
        the prior's own averages are.

    Returns
    -------
    Reweighted

    Raises
    ------
    ValueError
        If shapes do not fit, or sds or trust are not positive.

    Notes
    -----
    Least of trust * KL(w || prior) + chi2 / 2 [1]_ [2]_ [3]_. The minimum is
    w = prior * exp(-values @ lambda) / Z, where lambda minimises the convex
    ln Z + lambda @ measured + trust / 2 * sum((lambda * sds)**2), found here by
    Newton steps. Averages get their sd, and the measured values their
    probability, from the curvature at the minimum; the covariance of averages
    under the prior is that over the conformers divided by ``trust``.

    References
    ----------
    .. [1] S. F. Gull, G. J. Daniell, Nature 272 (1978) 686-690,
       doi:10.1038/272686a0.
    .. [2] G. Hummer, J. Kofinger, J. Chem. Phys. 143 (2015) 243150,
       doi:10.1063/1.4937786.
    .. [3] A. Cesari, S. Reisser, G. Bussi, Computation 6 (2018) 15,
       doi:10.3390/computation6010015.
    """
    _check(values, prior, measured, sds, trust)
    multipliers = np.zeros(measured.size)
    noise = trust * np.square(sds)
    height = _height(multipliers, values, prior, measured, noise)
    for _ in range(MOST_STEPS):
        weights = _weights(multipliers, values, prior)
        slope = measured - weights @ values + noise * multipliers
        curvature = covariance(values, weights) + np.diag(noise)
        step = np.linalg.solve(curvature, slope)
        if float(slope @ step) < CONVERGED:
            break
        size = 1.0
        while size > 1e-8:
            tried = multipliers - size * step
            reached = _height(tried, values, prior, measured, noise)
            if reached <= height - 1e-4 * size * float(slope @ step):
                multipliers, height = tried, reached
                break
            size /= 2.0
        else:
            break
    weights = _weights(multipliers, values, prior)
    return _result(weights, values, prior, measured, sds, trust)


def _result(
    weights: FloatArray,
    values: FloatArray,
    prior: FloatArray,
    measured: FloatArray,
    sds: FloatArray,
    trust: float,
) -> Reweighted:
    deviations = (weights @ values - measured) / sds
    kept = weights > 0.0
    entropy = float(weights[kept] @ np.log(weights[kept] / prior[kept]))
    spread = covariance(values, weights) / np.outer(sds, sds) / trust
    _, log_det = np.linalg.slogdet(np.eye(measured.size) + spread)
    log_evidence = (
        -trust * entropy
        - 0.5 * float(deviations @ deviations)
        - 0.5 * float(log_det)
        - float(np.log(np.sqrt(2.0 * np.pi) * sds).sum())
    )
    return Reweighted(
        weights=weights,
        prior=prior,
        values=values,
        sds=sds,
        deviations=deviations,
        relative_entropy=max(entropy, 0.0),
        log_evidence=log_evidence,
        trust=trust,
    )


def _check(
    values: FloatArray,
    prior: FloatArray,
    measured: FloatArray,
    sds: FloatArray,
    trust: float,
) -> None:
    if values.shape != (prior.size, measured.size) or sds.shape != measured.shape:
        raise ValueError(
            f"shapes differ: values {values.shape}, prior {prior.shape}, "
            f"measured {measured.shape}, sds {sds.shape}"
        )
    if not (np.all(sds > 0) and trust > 0):
        raise ValueError(f"sds and trust must be > 0, got {sds!r} and {trust!r}")


def _weights(
    multipliers: FloatArray, values: FloatArray, prior: FloatArray
) -> FloatArray:
    exponents = np.log(prior) - values @ multipliers
    raw = np.exp(exponents - exponents.max())
    return np.asarray(raw / raw.sum())


def _height(
    multipliers: FloatArray,
    values: FloatArray,
    prior: FloatArray,
    measured: FloatArray,
    noise: FloatArray,
) -> float:
    exponents = np.log(prior) - values @ multipliers
    top = float(exponents.max())
    log_z = top + float(np.log(np.exp(exponents - top).sum()))
    return (
        log_z
        + float(multipliers @ measured)
        + 0.5 * float(noise @ np.square(multipliers))
    )
