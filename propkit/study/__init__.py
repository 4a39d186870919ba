"""Studies over the chain: sweeps, uncertainty, sensitivity, and where their blocks run."""
