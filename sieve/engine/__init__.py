"""The sieve: relations, plans, saturation, verdicts."""
