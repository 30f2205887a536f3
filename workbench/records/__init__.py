"""Records: results with digests, saved, rerun, sealed, reported."""
