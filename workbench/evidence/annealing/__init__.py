"""Populations of draws that go from the prior to the posterior, for integrals that no grid can hold."""
