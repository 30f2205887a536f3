"""Likelihood: expected counts with derivatives, the log likelihood, fits, profiles, pulls and impacts."""
