"""The command line: `sieve COMMAND ...`."""

from __future__ import annotations

import click

from sieve import __version__


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="sieve")
def main() -> None:
    """Decide which p-adic candidates on a curve are rational points."""
