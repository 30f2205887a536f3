"""Hypotheses: priors, parameters, shapes, uncertainties, processes, the analysis and its file."""
