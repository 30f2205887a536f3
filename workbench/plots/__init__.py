"""Plots: results and axes in, marks out."""
