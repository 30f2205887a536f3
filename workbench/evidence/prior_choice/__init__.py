"""What the choice of a prior does to the Bayes factor: curves, families, bounds, power-scaling."""
