"""The integral over signal and nuisance coordinates: quadrature with Laplace, and draws that correct it."""
