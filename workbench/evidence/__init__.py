"""Evidence: the integral and its estimators, odds, prior sensitivity, intervals, significance."""
