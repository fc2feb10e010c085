"""What a structure claims: shifts and couplings with honest uncertainties."""
