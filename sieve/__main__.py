"""Run the command line as `python -m sieve`."""

from sieve.cli import main

if __name__ == "__main__":
    main()
