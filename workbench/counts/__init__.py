"""Counts: binning, tables, regions; one reader a format."""
