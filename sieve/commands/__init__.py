"""What the subcommands do, one module each; `sieve.cli` only parses arguments."""
