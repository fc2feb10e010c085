"""The verdict: a calibrated probability from the residuals of a fit."""

from __future__ import annotations

import functools
import json
from dataclasses import dataclass
from importlib import resources

import numpy as np

from spinledger.reconcile.coarse import FloatArray
from spinledger.values.ledger import VerdictState

PRIOR = 0.5


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class VerdictModel:
    """A logistic model; every feature counts against the structure.

    Attributes
    ----------
    names : tuple of str
        Features in order.
    weights : numpy.ndarray, shape (n_features,), >= 0
        Logits taken off per unit of a feature.
    intercept : float
        Logit of a structure without any fault, at a prior of 0.5.
    upper, lower : float
        Probabilities above which a structure is reconciled and under which it
        is not.
    temperature : float
        Divides differences of the selection score among contenders.
    """

    names: tuple[str, ...]
    weights: FloatArray
    intercept: float
    upper: float
    lower: float
    temperature: float


@functools.cache
def load_model() -> VerdictModel:
    """Model in the package; its making is told in data/SOURCE.md."""
    table = resources.files("spinledger.reconcile") / "data" / "verdict.json"
    raw = json.loads(table.read_text(encoding="utf-8"))
    return VerdictModel(
        names=tuple(raw["features"]),
        weights=np.array([raw["weights"][name] for name in raw["features"]]),
        intercept=float(raw["intercept"]),
        upper=float(raw["upper"]),
        lower=float(raw["lower"]),
        temperature=float(raw["temperature"]),
    )


def logit_of(faults: dict[str, float], model: VerdictModel) -> float:
    """Log odds at a prior of 0.5, from named features."""
    values = np.array([faults[name] for name in model.names])
    return model.intercept - float(values @ model.weights)


def probability_of(faults: dict[str, float], model: VerdictModel) -> float:
    """Probability that the structure is right, at a prior of 0.5."""
    return float(1.0 / (1.0 + np.exp(-np.clip(logit_of(faults, model), -30, 30))))


def state_of(probability: float, model: VerdictModel) -> VerdictState:
    """Verdict of a probability."""
    if probability >= model.upper:
        return "reconciled"
    if probability < model.lower:
        return "not reconciled"
    return "undecided"


def likelihood_ratio(probability: float, prior: float = PRIOR) -> float:
    """How much likelier the evidence is if the structure is right."""
    kept = min(max(probability, 1e-6), 1.0 - 1e-6)
    return (kept / (1.0 - kept)) * ((1.0 - prior) / prior)
