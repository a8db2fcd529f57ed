"""Exact arithmetic: prime powers, lattices, truncated series, p-adic numbers, finite abelian groups."""
