"""Linear-Gaussian estimation, evidence of marks of unknown size, robust summaries and decision rules."""
