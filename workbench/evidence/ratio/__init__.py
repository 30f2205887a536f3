"""The updating ratio over signal parameters: worked out at nodes, read between them, averaged over priors."""
