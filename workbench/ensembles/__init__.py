"""Ensembles: pseudo-experiments drawn and run, adequacy, following, forecasting, calibration."""
