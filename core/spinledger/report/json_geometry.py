"""The "geometry" part of ledger.json; J in Hz, angles in degrees."""

from __future__ import annotations

from typing import Any

from spinledger.report.numbers import finite
from spinledger.values.geometry import ConfigurationOdds, DihedralShare, Geometry


def geometry_to_json(geometry: Geometry | None) -> dict[str, Any] | None:
    """Populations and relative configuration as plain values; None if unknown."""
    if geometry is None:
        return None
    return {
        "sentences": list(geometry.sentences),
        "n_conformers": geometry.n_conformers,
        "effective_share": finite(geometry.effective_share),
        "misfit_before": finite(geometry.misfit_before),
        "misfit_after": finite(geometry.misfit_after),
        "dihedrals": [_dihedral(one) for one in geometry.dihedrals],
        "configurations": [_configuration(one) for one in geometry.configurations],
    }


def _dihedral(one: DihedralShare) -> dict[str, Any]:
    return {
        "claim": one.first,
        "partner": one.second,
        "in_ring": one.is_in_ring,
        "j_hz": finite(one.j_hz),
        "j_sd_hz": finite(one.j_sd_hz),
        "fitted_j_hz": finite(one.fitted_j_hz),
        "anti_share": finite(one.anti_share),
        "anti_share_sd": finite(one.anti_share_sd),
        "prior_anti_share": finite(one.prior_anti_share),
        "angle_deg": finite(one.angle_deg),
        "angle_sd_deg": finite(one.angle_sd_deg),
    }


def _configuration(one: ConfigurationOdds) -> dict[str, Any]:
    return {
        "smiles": one.smiles,
        "name": one.name,
        "probability": finite(one.probability),
        "drawn": one.is_drawn,
        "misfit_sd": finite(one.misfit_sd),
    }
