"""The command line: `sieve COMMAND ...`.  Arguments in, exit codes out; the work is in `sieve.commands`."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Iterator
from concurrent.futures import Executor
from contextlib import ExitStack, contextmanager
from pathlib import Path
from typing import Any

import click

from sieve import __version__
from sieve.commands import advise as advise_command
from sieve.commands import appendix as appendix_command
from sieve.commands import candidates as candidates_command
from sieve.commands import check as check_command
from sieve.commands import draw as draw_command
from sieve.commands import inspect as inspect_command
from sieve.commands import propose as propose_command
from sieve.commands import run as run_command
from sieve.commands.common import Progress, parse_primes, workers
from sieve.errors import Inconsistent, InputError, SieveError
from sieve.files.result import json_text, write_whole
from sieve.files.store import Store

BAD_INPUT = 2
INTERRUPTED = 130


class _Group(click.Group):
    """Click's own usage errors in the one-line form of the interface."""

    def main(self, *args: Any, **kwargs: Any) -> Any:
        kwargs["standalone_mode"] = False
        try:
            code = super().main(*args, **kwargs)
            sys.exit(code if isinstance(code, int) else 0)
        except click.exceptions.Abort:
            sys.exit(INTERRUPTED)
        except click.UsageError as error:
            _fail(f"command line: {error.format_message()}, expected the usage that --help shows")
        except click.ClickException as error:
            _fail(error.format_message())


def _fail(message: str) -> None:
    sys.stderr.write("sieve: error: " + " ".join(message.split()) + "\n")
    sys.exit(BAD_INPUT)


def _guard(case: str, work: Callable[[], int]) -> int:
    """Run a command; every expected failure becomes one line and an exit code."""
    try:
        return work()
    except KeyboardInterrupt:
        sys.stderr.write("sieve: interrupted, progress kept\n")
        return INTERRUPTED
    except InputError as error:
        _fail(error.line)
    except Inconsistent as error:
        where = "" if error.witness in str(error) else f"{error.witness}: "
        _fail(f"{error.file or case}: {where}{error}, expected {error.expected}")
    except SieveError as error:
        _fail(f"{case}: {error}")
    except BrokenPipeError:
        # nothing can be printed any more, not even at exit
        sys.stdout = open(os.devnull, "w")
        _fail("standard output: closed before everything was written, expected a reader to the end")
    except OSError as error:
        what = f"{error.filename or case}: {error.strerror or error}"
        _fail(f"{what}, expected a readable file and a writable directory")
    return BAD_INPUT


@click.group(cls=_Group, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="sieve")
def main() -> None:
    """Prove that p-adic candidates on a curve are not rational points (a Mordell-Weil sieve).

    Example: sieve run data/demo/case.toml -c data/demo/candidates.json
    """


def _common(command: Callable[..., Any]) -> Callable[..., Any]:
    for option in (
        click.option(
            "--json", "as_json", is_flag=True, help="One JSON document on standard output, nothing else."
        ),
        click.option("-v", "--verbose", is_flag=True, help="Say what is being done, on standard error."),
        click.option("--jobs", type=click.IntRange(0, 256), default=0, help="Processes (0: all cores)."),
        click.option(
            "--store", type=click.Path(dir_okay=False), help="File that keeps local data between runs."
        ),
    ):
        command = option(command)
    return command


def _bound(value: int | None, option: str = "--bound") -> int | None:
    if value is not None and not 3 <= value <= 2**20:
        raise InputError(option, "", str(value), "a bound between 3 and 2^20")
    return value


@contextmanager
def _resources(store: str | None, jobs: int) -> Iterator[tuple[Store | None, Executor | None]]:
    """The store, if one is named, and the workers of a command."""
    with ExitStack() as stack:
        kept = stack.enter_context(Store(store)) if store else None
        yield kept, stack.enter_context(workers(jobs))


def _show(as_json: bool, document: Any, text: Callable[[], str]) -> int:
    """Print the outcome of a command in one of its two forms; the exit code of success."""
    click.echo(json_text(document) if as_json else text(), nl=False)
    return 0


@main.command("run", epilog="Example: sieve run case.toml -c candidates7.json -o out --bound 1000")
@click.argument("case")
@click.option("-c", "--candidates", multiple=True, help="A candidate file (once for each Chabauty prime).")
@click.option("-o", "--output", help="Directory for result.json, proof.jsonl, report.txt (default NAME.out).")
@click.option(
    "--bound", type=int, help="Use auxiliary primes below this (default: grows until all is decided)."
)
@click.option("--primes", help="Use exactly these auxiliary primes, separated by commas.")
@click.option("--time", "seconds", type=float, help="Start no new local data after this many seconds.")
@click.option(
    "--proof",
    type=click.Choice(["trimmed", "full"]),
    default="trimmed",
    help="Keep in the proof log what the verdicts need, or every usable prime.",
)
@_common
def run(
    case: str,
    candidates: tuple[str, ...],
    output: str | None,
    bound: int | None,
    primes: str | None,
    seconds: float | None,
    proof: str,
    as_json: bool,
    verbose: bool,
    jobs: int,
    store: str | None,
) -> int:
    """Decide the candidates of CASE, or, without candidates, whether X(Q) is empty.

    Exit code 0: every candidate is decided (without candidates: X(Q) is proved empty); 1: something stays
    open.
    """
    progress = Progress(verbose)

    def work() -> int:
        if seconds is not None and not seconds > 0:
            raise InputError("--time", "", str(seconds), "a positive number of seconds")
        wanted = None if primes is None else parse_primes(primes)
        limit = _bound(bound)
        name = run_command.case_name(case)
        directory = Path(output) if output else Path(f"{name}.out")
        if directory.exists() and not directory.is_dir():
            raise InputError(str(directory), "", "a file", "a directory for the results")
        path = Path(store) if store else run_command.default_store(directory)
        with Store(path) as kept, workers(jobs) as executor:
            done = run_command.execute(
                case,
                candidates,
                bound=limit,
                primes=wanted,
                seconds=seconds,
                store=kept,
                executor=executor,
                progress=progress,
            )
        result = run_command.write_files(done, directory, proof == "full")
        progress.close()
        for warning in done.warnings:
            click.echo(f"sieve: warning: {warning}", err=True)
        if as_json:
            click.echo(json_text(result.document()), nl=False)
        else:
            click.echo((directory / "report.txt").read_text(encoding="utf-8"), nl=False)
        return done.exit_code

    return _guard(case, work)


@main.command("inspect", epilog="Example: sieve inspect case.toml --bound 60 --padic 7:10")
@click.argument("case")
@click.option("--bound", type=int, help="Show auxiliary primes below this.")
@click.option("--primes", help="Show exactly these auxiliary primes, separated by commas.")
@click.option("--padic", multiple=True, help="P:N, coefficients of the known points at P with N digits.")
@click.option("--propose", is_flag=True, help="Print a case file with a base and generators from a search.")
@_common
def inspect(
    case: str,
    bound: int | None,
    primes: str | None,
    padic: tuple[str, ...],
    propose: bool,
    as_json: bool,
    verbose: bool,
    jobs: int,
    store: str | None,
) -> int:
    """Check CASE: groups J(F_v), torsion, independence, saturation, coefficients of the known points.

    With --propose CASE may lack known points, base and generators: they are looked for.
    """
    progress = Progress(verbose)

    def work() -> int:
        if propose:
            with workers(jobs) as executor:
                proposed = propose_command.execute(case, executor)
            return _show(
                as_json, propose_command.document(proposed), lambda: propose_command.text(proposed)
            )
        wanted = None if primes is None else parse_primes(primes)
        limit = _bound(bound)
        with _resources(store, jobs) as (kept, executor):
            done = inspect_command.execute(
                case,
                bound=limit,
                primes=wanted,
                padic=padic,
                store=kept,
                executor=executor,
                progress=progress,
            )
        progress.close()
        return _show(as_json, inspect_command.document(done), lambda: inspect_command.text(done))

    return _guard(case, work)


@main.command("advise", epilog="Example: sieve advise case.toml -c candidates7.json --bound 2000 --top 5")
@click.argument("case")
@click.option("-c", "--candidates", multiple=True, help="A candidate file (once for each Chabauty prime).")
@click.option("--bound", type=int, help="Advise on auxiliary primes below this (default 1000).")
@click.option("--top", type=int, default=10, show_default=True, help="So many primes at most.")
@click.option("--chabauty-bound", type=int, help="Also compare the Chabauty primes up to this.")
@_common
def advise(
    case: str,
    candidates: tuple[str, ...],
    bound: int | None,
    top: int,
    chabauty_bound: int | None,
    as_json: bool,
    verbose: bool,
    jobs: int,
    store: str | None,
) -> int:
    """Which auxiliary primes to add next for the open candidates of CASE, or for the whole sieve."""
    progress = Progress(verbose)

    def work() -> int:
        limit = _bound(bound)
        most = advise_command.check_top(top)
        chabauty = _bound(chabauty_bound, "--chabauty-bound")
        with _resources(store, jobs) as (kept, executor):
            done = advise_command.execute(
                case,
                candidates,
                bound=limit,
                top=most,
                chabauty_bound=chabauty,
                store=kept,
                executor=executor,
                progress=progress,
            )
        progress.close()
        return _show(as_json, advise_command.document(done), lambda: advise_command.text(done))

    return _guard(case, work)


@main.command("candidates", epilog="Example: sieve candidates case.toml --prime 7 --precision 12 -o c7.json")
@click.argument("case")
@click.option("--prime", type=int, help="The odd prime (default: the best of several).")
@click.option("--precision", type=int, help="Digits of every zero (default: enough for the sieve).")
@click.option("-o", "--output", help="The candidate file to write (default: standard output).")
@_common
def candidates(
    case: str,
    prime: int | None,
    precision: int | None,
    output: str | None,
    as_json: bool,
    verbose: bool,
    jobs: int,
    store: str | None,
) -> int:
    """Linear Chabauty for CASE, whose rank must be below the genus: writes a complete candidate file."""
    progress = Progress(verbose)

    def work() -> int:
        with workers(jobs) as executor:
            done = candidates_command.execute(
                case, prime=prime, precision=precision, executor=executor, progress=progress
            )
        progress.close()
        file = json_text(candidates_command.candidate_document(done))
        if output is not None:
            write_whole(output, file)
        return _show(
            as_json,
            candidates_command.document(done),
            lambda: file if output is None else candidates_command.text(done),
        )

    return _guard(case, work)


@main.command("check", epilog="Example: sieve check demo.out/proof.jsonl")
@click.argument("proof")
@click.option("--json", "as_json", is_flag=True, help="One JSON document on standard output, nothing else.")
@click.option("-v", "--verbose", is_flag=True, help="Say what is being done, on standard error.")
def check(proof: str, as_json: bool, verbose: bool) -> int:
    """Check the proof log PROOF independently of the run that wrote it.

    Exit code 0: accepted; 3: rejected, with the line, the record and the reason; 2: declined or unreadable.
    """
    Progress(verbose).say(f"checking {proof}")
    return _guard(proof, lambda: check_command.execute(proof, as_json))


@main.command("appendix", epilog="Example: sieve appendix demo.out/proof.jsonl -o appendix.tex")
@click.argument("proof")
@click.option("-o", "--output", required=True, help="The file to write; it ends in .tex, .md or .html.")
@click.option("--json", "as_json", is_flag=True, help="One JSON document on standard output, nothing else.")
@click.option("-v", "--verbose", is_flag=True, help="Say what is being done, on standard error.")
def appendix(proof: str, output: str, as_json: bool, verbose: bool) -> int:
    """Write the appendix of a paper from the proof log PROOF alone (it is not checked: see `check`)."""
    return _from_log(appendix_command.execute, proof, output, as_json, verbose)


@main.command("draw", epilog="Example: sieve draw demo.out/proof.jsonl -o graph.svg")
@click.argument("proof")
@click.option("-o", "--output", required=True, help="The file to write; it ends in .svg, .tex or .graphml.")
@click.option("--json", "as_json", is_flag=True, help="One JSON document on standard output, nothing else.")
@click.option("-v", "--verbose", is_flag=True, help="Say what is being done, on standard error.")
def draw(proof: str, output: str, as_json: bool, verbose: bool) -> int:
    """Draw the constraint graph of the proof log PROOF: conditions, and the primes l that join them."""
    return _from_log(draw_command.execute, proof, output, as_json, verbose)


def _from_log(
    execute: Callable[[str, str], None], proof: str, output: str, as_json: bool, verbose: bool
) -> int:
    """Write a file made from a proof log."""

    def work() -> int:
        Progress(verbose).say(f"reading {proof}")
        execute(proof, output)
        if as_json:
            click.echo(json_text({"proof": proof, "output": output}), nl=False)
        else:
            click.echo(f"wrote {output}")
        return 0

    return _guard(proof, work)
