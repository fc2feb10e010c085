"""Couplings between saturated carbons: training blocks, models and errors; J in Hz."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import lightgbm
import numpy as np
from couplings_blocks import Block, best_order, saturated_blocks, symmetrised
from couplings_data import Frames, Row, by_entry, scaffold_groups, skeleton
from couplings_fit import (
    N_FOLDS,
    TREES,
    Floats,
    Linear,
    Texts,
    fit_ridge,
    fit_trees,
    folds,
)

from spinledger.prediction.couplings.chain_features import bond_features
from spinledger.prediction.couplings.frame import Frame
from spinledger.prediction.couplings.ribose import ribose_key
from spinledger.prediction.couplings.symmetry import PairSymmetry
from spinledger.prediction.couplings.tables import rule
from spinledger.prediction.couplings.vicinal import Bond, rotor_mean_hz
from spinledger.values.claim import Particle

CHAIN_TREES: dict[str, Any] = TREES | {
    "alpha": 1.0,
    "num_leaves": 9,
    "min_data_in_leaf": 6,
    "lambda_l2": 1.0,
}
N_CHAIN_TREES = 150
CHAIN_RIDGE = 5.0
TRAINED_MEANS = {
    "chain CH2-CH3": "chain_ch2_ch3",
    "chain CH2-CH2": "chain_ch2_ch2",
    "ring6 CH2-CH2": "ring6_ch2_ch2",
    "ring5 CH2-CH2": "ring5_ch2_ch2",
}
#: A constant bias is only taken from so many blocks.
FEWEST_FOR_BIAS = 15


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class BlockData:
    """One kind of carbon-carbon bond with features and HLA values.

    Attributes
    ----------
    blocks : sequence of Block
    hla : sequence of numpy.ndarray
        HLA value of each block, symmetrised like the block.
    features : numpy.ndarray, shape (n, n_features)
    groups : numpy.ndarray of str, shape (n,)
    weights : numpy.ndarray, shape (n,)
        Many entries of one compound count less.
    """

    blocks: Sequence[Block]
    hla: Sequence[Floats]
    features: Floats
    groups: Texts
    weights: Floats

    @property
    def means_hz(self) -> Floats:
        """Published mean of each block."""
        return np.array([block.mean_hz for block in self.blocks])

    @property
    def hla_means_hz(self) -> Floats:
        """HLA mean of each block."""
        return np.array([values.mean() for values in self.hla])


def block_data(rows: Iterable[Row], frames: Frames) -> dict[str, BlockData]:
    """Blocks by kind ('chain CH-CH2', 'ring6 CH2-CH2', ...)."""
    found: dict[str, list[tuple[Block, Floats, Floats]]] = {}
    for entry in by_entry(rows).values():
        if "." in entry[0].smiles:
            continue
        frame = frames.of(entry[0].smiles)
        for block in saturated_blocks(entry, frame.mol):
            kind, item = _described(block, frames)
            found.setdefault(kind, []).append(item)
    return {kind: _stacked(items) for kind, items in sorted(found.items())}


def _described(
    block: Block, frames: Frames
) -> tuple[str, tuple[Block, Floats, Floats]]:
    frame = frames.of(block.smiles)
    a, b = block.carbons
    size = frame.ring_size(a, b)
    kind = f"{f'ring{size}' if size else 'chain'} {block.kind}"
    features = bond_features(frame, a, b)
    key = None
    if size == 5:
        key = ribose_key(frames.with_conformers(block.smiles), a, b)
    if key is not None:
        return kind, (block, np.array([[rule(key).j_hz]]), features)
    if 3 in block.n_hydrogens:
        return kind, (block, np.array([[rotor_mean_hz(frame, a, b)]]), features)
    frame = frames.with_conformers(block.smiles)
    means, _ = Bond(frame=frame, a=a, b=b).hla()
    enantiotopic = [_is_enantiotopic(frame, carbon) for carbon in block.carbons]
    return kind, (
        _settled(block, enantiotopic),
        _averaged(means, enantiotopic),
        features,
    )


def _is_enantiotopic(frame: Frame, carbon: int) -> bool:
    hydrogens = frame.hydrogens(carbon)
    if len(hydrogens) != 2:
        return False
    symmetry = PairSymmetry(frame)
    keys = {
        symmetry.particle_key(
            Particle(claim=0, nucleus="1H", n_spins=1, hydrogens=(hydrogen,))
        )
        for hydrogen in hydrogens
    }
    return len(keys) == 1


def _averaged(values: Floats, enantiotopic: Sequence[bool]) -> Floats:
    """What a time average over mirror images leaves of the HLA values."""
    if values.shape == (2, 2) and all(enantiotopic):
        return (values + values[::-1, ::-1]) / 2
    for axis, is_averaged in enumerate(enantiotopic):
        if is_averaged and values.shape[axis] == 2:
            mean = values.mean(axis=axis, keepdims=True)
            values = np.repeat(mean, 2, axis=axis)
    return values


def _settled(block: Block, enantiotopic: Sequence[bool]) -> Block:
    """AA'XX' blocks made symmetric, or only their mean believed."""
    if not (
        block.has_split and block.couplings_hz.shape == (2, 2) and all(enantiotopic)
    ):
        return block
    symmetric = symmetrised(block.couplings_hz)
    return Block(
        entry=block.entry,
        smiles=block.smiles,
        carbons=block.carbons,
        n_hydrogens=block.n_hydrogens,
        couplings_hz=block.couplings_hz if symmetric is None else symmetric,
        has_split=symmetric is not None,
    )


def _stacked(items: Sequence[tuple[Block, Floats, Floats]]) -> BlockData:
    names = [skeleton(block.smiles) for block, _, _ in items]
    weights = np.array([1 / np.sqrt(names.count(name)) for name in names])
    return BlockData(
        blocks=[item[0] for item in items],
        hla=[item[1] for item in items],
        features=np.array([item[2] for item in items]),
        groups=np.array(scaffold_groups([item[0].smiles for item in items])),
        weights=weights,
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Blend:
    """Mean of a ridge regression and of trees about a level."""

    base: float
    linear: Linear
    trees: lightgbm.Booster

    def predict(self, features: Floats) -> Floats:
        """Values for rows of features."""
        trees = np.asarray(self.trees.predict(features, num_threads=1))
        return (self.linear.predict(features) + self.base + trees) / 2


def fit_blend(features: Floats, values: Floats, weights: Floats) -> Blend:
    """Train both models on the same rows."""
    base = float(np.median(values))
    return Blend(
        base=base,
        linear=fit_ridge(features, values, weights, CHAIN_RIDGE),
        trees=fit_trees(features, values - base, weights, CHAIN_TREES, N_CHAIN_TREES),
    )


def out_of_fold(features: Floats, values: Floats, data: BlockData, seed: int) -> Floats:
    """Blend predictions of rows whose scaffold the models never saw."""
    fold = folds(data.groups, seed)
    predicted = np.full(values.size, np.nan)
    for number in range(N_FOLDS):
        rows = fold != number
        model = fit_blend(features[rows], values[rows], data.weights[rows])
        predicted[~rows] = model.predict(features[~rows])
    return predicted


def gaps_hz(data: BlockData) -> Floats:
    """Difference of the two couplings of a CH-CH2 block."""
    return np.array([float(np.ptp(block.couplings_hz)) for block in data.blocks])


def with_hla(data: BlockData) -> Floats:
    """Features and the HLA mean."""
    return np.column_stack([data.features, data.hla_means_hz])


def constant_out_of_fold(values: Floats, data: BlockData, seed: int) -> Floats:
    """Median of the other folds."""
    fold = folds(data.groups, seed)
    return np.array([np.median(values[fold != number]) for number in fold])


def block_predictions(kind: str, data: BlockData, seed: int) -> list[Floats]:
    """Every block as the library would predict it, out of fold."""
    lacks = data.means_hz - data.hla_means_hz
    if kind == "chain CH-CH2":
        mean = out_of_fold(data.features, data.means_hz, data, seed)
        gap = np.maximum(out_of_fold(data.features, gaps_hz(data), data, seed), 0.0)
        return [
            np.array([[m + g / 2, m - g / 2]]) for m, g in zip(mean, gap, strict=True)
        ]
    if kind in TRAINED_MEANS:
        lack = out_of_fold(with_hla(data), lacks, data, seed)
        return [
            values * (values.mean() + extra) / values.mean()
            for values, extra in zip(data.hla, lack, strict=True)
        ]
    if len(data.blocks) < FEWEST_FOR_BIAS:
        return list(data.hla)
    bias = constant_out_of_fold(lacks, data, seed)
    return [values + extra for values, extra in zip(data.hla, bias, strict=True)]


def block_errors(data: BlockData, predicted: Sequence[Floats]) -> tuple[Floats, Floats]:
    """Errors of single values (labels in the best order) and of block means."""
    single = [
        (best_order(block.couplings_hz, values) - values).ravel()
        for block, values in zip(data.blocks, predicted, strict=True)
        if block.has_split or block.couplings_hz.size == 1
    ]
    means = [
        block.mean_hz - float(values.mean())
        for block, values in zip(data.blocks, predicted, strict=True)
    ]
    return np.concatenate(single) if single else np.zeros(0), np.array(means)


def groups_of_values(data: BlockData) -> Texts:
    """Scaffold group of every single value of ``block_errors``."""
    counts = [
        block.couplings_hz.size
        if block.has_split or block.couplings_hz.size == 1
        else 0
        for block in data.blocks
    ]
    return np.repeat(data.groups, counts)


def final_blends(blocks: Mapping[str, BlockData]) -> dict[str, Blend]:
    """Models of all blocks, by file name."""
    chain = blocks["chain CH-CH2"]
    blends = {
        "chain_ch_ch2_mean": fit_blend(chain.features, chain.means_hz, chain.weights),
        "chain_ch_ch2_gap": fit_blend(chain.features, gaps_hz(chain), chain.weights),
    }
    for kind, name in TRAINED_MEANS.items():
        data = blocks[kind]
        lacks = data.means_hz - data.hla_means_hz
        blends[name] = fit_blend(with_hla(data), lacks, data.weights)
    return blends
