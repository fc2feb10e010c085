"""How much there is: content by internal standard, and residual solvents."""
