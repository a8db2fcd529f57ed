"""Proof logs: what was used, in a form that can be checked again."""
