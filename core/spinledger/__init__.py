"""Spin Ledger: reconciles a proton spectrum with a claimed structure.

The package itself imports nothing heavy; take what is needed from its rooms,
for example ``from spinledger.reconcile.run import reconcile``.
"""

__version__ = "0.1.0"

__all__ = ["__version__"]
