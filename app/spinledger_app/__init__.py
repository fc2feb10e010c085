"""The bench: the desktop program over the Spin Ledger core."""
