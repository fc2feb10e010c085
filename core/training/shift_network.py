"""Training of the small network: Adam on the Huber loss, plain numpy."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
import numpy.typing as npt

from spinledger.prediction.shifts_network import Network, Rows, scaled

HIDDEN = (256, 128)
EPOCHS = 14
BATCH = 512
STEP = 1e-3
WARM_UP_STEPS = 200
DROPPED_INPUTS = 0.05
DROPPED_UNITS = 0.2
DECAY = 1e-5
ROBUST_PPM = 0.25
SMALLEST_SPREAD = 1e-3


@dataclass(slots=True)
class _Adam:
    """Moments of every parameter (D. P. Kingma, J. Ba, arXiv:1412.6980)."""

    parameters: list[Rows]
    first: list[Rows]
    second: list[Rows]
    steps: int = 0

    def move(self, gradients: list[Rows], rate: float) -> None:
        """One step down the gradient."""
        self.steps += 1
        corrected = rate * np.sqrt(1 - 0.999**self.steps) / (1 - 0.9**self.steps)
        for index, gradient in enumerate(gradients):
            self.first[index] += np.float32(0.1) * (gradient - self.first[index])
            self.second[index] += np.float32(0.001) * (
                gradient * gradient - self.second[index]
            )
            self.parameters[index] -= np.float32(corrected) * (
                self.first[index] / (np.sqrt(self.second[index]) + np.float32(1e-8))
            )


def train_network(
    inputs: Rows, targets_ppm: npt.NDArray[np.float64], seed: int
) -> Network:
    """Network that predicts the targets from the inputs.

    Parameters
    ----------
    inputs : numpy.ndarray of float32, shape (n_rows, n_inputs)
    targets_ppm : numpy.ndarray, shape (n_rows,), ppm
    seed : int
    """
    rng = np.random.default_rng(seed)
    centre = inputs.mean(axis=0)
    spread = inputs.std(axis=0) + np.float32(SMALLEST_SPREAD)
    rows = scaled(inputs, centre, spread)
    targets = targets_ppm.astype(np.float32)
    sizes = (rows.shape[1], *HIDDEN, 1)
    weights = [
        (rng.standard_normal((a, b)) * np.sqrt(2 / a)).astype(np.float32)
        for a, b in pairwise(sizes)
    ]
    weights[-1] *= np.float32(0.1)
    biases = [np.zeros(size, np.float32) for size in sizes[1:]]
    parameters = weights + biases
    adam = _Adam(
        parameters,
        [np.zeros_like(p) for p in parameters],
        [np.zeros_like(p) for p in parameters],
    )
    n_batches = len(rows) // BATCH
    for _ in range(EPOCHS):
        order = rng.permutation(len(rows))
        for batch in range(n_batches):
            chosen = order[batch * BATCH : (batch + 1) * BATCH]
            gradients = _gradients(weights, biases, rows[chosen], targets[chosen], rng)
            warm = min(1.0, (adam.steps + 1) / WARM_UP_STEPS)
            fall = 0.5 * (1 + np.cos(np.pi * adam.steps / (EPOCHS * n_batches)))
            adam.move(gradients, STEP * warm * fall)
    return Network(
        centre=centre, spread=spread, weights=tuple(weights), biases=tuple(biases)
    )


def _gradients(
    weights: list[Rows],
    biases: list[Rows],
    rows: Rows,
    targets: Rows,
    rng: np.random.Generator,
) -> list[Rows]:
    """Gradients of the mean Huber loss, weights first, then biases."""
    layers = [rows * (rng.random(rows.shape, dtype=np.float32) > DROPPED_INPUTS)]
    for weight, bias in zip(weights[:-1], biases[:-1], strict=True):
        active = np.maximum(layers[-1] @ weight + bias, 0)
        kept = rng.random(active.shape, dtype=np.float32) > DROPPED_UNITS
        layers.append(active * kept / np.float32(1 - DROPPED_UNITS))
    found = (layers[-1] @ weights[-1] + biases[-1])[:, 0]
    slope = np.clip(found - targets, -ROBUST_PPM, ROBUST_PPM)[:, None] / len(rows)
    of_weights: list[Rows] = []
    of_biases: list[Rows] = []
    for depth in range(len(weights) - 1, -1, -1):
        of_weights.insert(0, layers[depth].T @ slope + DECAY * weights[depth])
        of_biases.insert(0, slope.sum(axis=0))
        if depth:
            slope = (slope @ weights[depth].T) * (layers[depth] > 0)
    return of_weights + of_biases
