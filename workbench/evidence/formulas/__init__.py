"""Closed forms, significances and scales of the literature: answers by themselves, oracles for the engine."""
