"""Curves: models, notation, points, divisors, reductions, local parameters, differentials."""
