"""The ledger: what carries the evidence, by bin, by region and by uncertainty."""
