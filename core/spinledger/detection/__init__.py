"""From a spectrum to signals with lines, integrals and uncertainties."""
