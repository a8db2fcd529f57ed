"""A Mordell–Weil sieve: which p-adic candidates on a curve are rational points?"""

__version__ = "0.1.0"
