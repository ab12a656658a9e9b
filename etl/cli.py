"""The command ``trialwright``: arguments, progress, exit status, and nothing else."""

from __future__ import annotations

import shutil
import signal
import sys
import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from types import FrameType
from typing import Any, NoReturn

import click
from click.shell_completion import get_completion_class
from rich.console import Console
from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn

import etl
from etl.session import PUBLISHED, Wanted, explained, told, write_lines, write_picture

INPUT_WRONG = 2
FAULT = 1
#: A command that a signal ended exits with this and the number of the signal.
SIGNALLED = 128

#: What asks a program to end: the keyboard, the system, the terminal that closes.
_ASKING_TO_END = ("SIGINT", "SIGTERM", "SIGHUP", "SIGBREAK")
#: For so long after the first, more of them do not disturb the tidying up.
_TIDYING_S = 5.0

_STUDY = click.argument("study", type=click.Path(path_type=Path))
_WORKERS = click.option(
    "--workers",
    type=click.IntRange(1),
    help="Number of processes. Found out from the size of the logs where absent; the tables are "
    "the same with any number.",
)
_QUIET = click.option("--quiet", is_flag=True, help="Show no progress and no summary.")


class _Command(click.Group):
    """Turns what can go wrong into a message and an exit status."""

    def invoke(self, ctx: click.Context) -> Any:
        """Run a command; wrong input exits with 2, a fault of the program with 1."""
        try:
            with _answering_signals():
                return super().invoke(ctx)
        except KeyboardInterrupt as stop:
            # What a build left is told where it was interrupted.
            click.echo("; ".join(["interrupted", *getattr(stop, "__notes__", [])[:1]]), err=True)
            ctx.exit(SIGNALLED + getattr(stop, "number", signal.SIGINT))
        except etl.InputError as wrong:
            click.echo(str(wrong), err=True)
            ctx.exit(INPUT_WRONG)
        except (click.ClickException, click.Abort, click.exceptions.Exit):
            raise
        except BrokenPipeError:
            ctx.exit(0)
        except Exception as fault:
            _tell_fault(fault)
            ctx.exit(FAULT)


class _AskedToEndError(KeyboardInterrupt):
    """A signal that asks the program to end, by its number."""

    def __init__(self, number: int) -> None:
        super().__init__()
        self.number = number


#: The signals that came. A library may lose the interruption that one raises; so it is looked at
#: again whenever something is done, and before anything is published.
_asked: list[int] = []
#: Whether a build is in its place.
_published: list[bool] = []


def _heeding(show: Callable[[str, int, int], None]) -> Callable[[str, int, int], None]:
    """Progress that ends the command where a signal asked for it."""

    def heed(stage: str, done: int, total: int) -> None:
        if stage == PUBLISHED:
            # Nothing is left but to say what was built: that is no time to be interrupted.
            _published.append(True)
            return
        if _asked:
            raise _AskedToEndError(_asked[0])
        show(stage, done, total)

    return heed


@contextmanager
def _answering_signals() -> Iterator[None]:
    """Turn every signal that asks the program to end into an interruption, which tidies up."""
    if threading.current_thread() is not threading.main_thread():
        yield
        return
    first: list[float] = []
    _asked.clear()
    _published.clear()

    def answer(number: int, _: FrameType | None) -> None:
        if _published:
            return
        now = time.monotonic()
        _asked.append(number)
        if not first or now - first[-1] > _TIDYING_S:
            first.append(now)
            raise _AskedToEndError(number)

    numbers = [getattr(signal, name) for name in _ASKING_TO_END if hasattr(signal, name)]
    # Whoever started the program may have told it to ignore some, as nohup does.
    taken = [number for number in numbers if signal.getsignal(number) is not signal.SIG_IGN]
    before = {number: signal.signal(number, answer) for number in taken}
    try:
        yield
    finally:
        for number, handler in before.items():
            signal.signal(number, signal.SIG_DFL if handler is None else handler)


def _tell_fault(fault: Exception) -> None:
    """Say that the program is at fault, in one paragraph that can be reported."""
    trace = fault.__traceback__
    while trace is not None and trace.tb_next is not None:
        trace = trace.tb_next
    place = ""
    if trace is not None:
        code = trace.tb_frame.f_code
        place = f" at {Path(code.co_filename).name}:{trace.tb_lineno} in {code.co_name}"
    click.echo(
        f"trialwright: a fault of the program, not of your data: {type(fault).__name__}: {fault}"
        f"{place}; nothing was written. Please report this line with the study file.",
        err=True,
    )


@click.group(cls=_Command, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="trialwright", prog_name="trialwright")
def main() -> None:
    """From a session folder of fixation logs to trial-level reading outcomes.

    Readers' recordings are personal data: use pseudonyms, keep to your ethics approval and your
    data-protection law. Nothing here is fit for diagnosis.
    """


@main.command()
@click.argument("logs", nargs=-1, required=True, metavar="LOG...")
@click.option(
    "--into",
    default="study.toml",
    show_default=True,
    metavar="FILE",
    help="Where the study file goes; it must not be there yet. With - it is printed.",
)
def draft(logs: tuple[str, ...], into: str) -> None:
    """Look at logs and write a study file to start from.

    LOG is a log, a pattern such as "logs/*.tsv", or a folder with logs in it. Every guess stands in
    the study file with its evidence; what only you can know is left as a question.
    """
    to_stdout = into == "-"
    drafted = etl.draft(logs, into=None if to_stdout else into)
    for line in drafted.findings.lines():
        click.echo(line, err=True)
    click.echo(
        drafted.text if to_stdout else drafted.told(on_terminal=sys.stdout.isatty()),
        nl=not to_stdout,
    )


@main.command()
@_STUDY
@_WORKERS
@_QUIET
def check(study: Path, workers: int | None, *, quiet: bool) -> None:
    """Read everything that STUDY names, write nothing, list all findings.

    Each finding names file and line, what was found, what was expected and what to do.
    """
    loaded = etl.load_study(study)
    with _progress(quiet=quiet) as progress:
        findings = etl.check(loaded, workers=workers, progress=progress)
    if findings.failed:
        raise etl.DataError(findings)
    click.echo("\n".join([*findings.lines(), told.checked(findings)]))


@main.command()
@_STUDY
@click.option(
    "--into",
    type=click.Path(path_type=Path),
    help="The output folder, instead of the one that STUDY names.",
)
@_WORKERS
@click.option(
    "--scheduler",
    metavar="ADDRESS",
    help="Have a Dask cluster do the work, in place of processes of this computer: the address of "
    "its scheduler, such as tcp://node1:8786. The tables are the same.",
)
@click.option(
    "--no-keep",
    is_flag=True,
    help="Do without what earlier builds kept beside the output folder, and keep nothing for the "
    "next one. The tables are the same.",
)
@_QUIET
def build(
    study: Path,
    into: Path | None,
    workers: int | None,
    scheduler: str | None,
    *,
    no_keep: bool,
    quiet: bool,
) -> None:
    """Build the tables of STUDY.

    They appear all at once in the output folder that STUDY names, beside the study file. An earlier
    build there is replaced as a whole; if anything is wrong, it stays as it was and every problem
    is listed.
    """
    if scheduler is not None and workers is not None:
        raise click.UsageError(
            "--workers says how many processes this computer starts, and with --scheduler it "
            "starts none: leave one of them out"
        )
    loaded = etl.load_study(study)
    with _progress(quiet=quiet) as progress:
        result = etl.build(
            loaded,
            into=into,
            workers=1 if scheduler is not None else workers,
            progress=progress,
            keep=not no_keep,
            scheduler=scheduler,
        )
    if not quiet:
        click.echo("\n".join([*result.findings.lines(), told.built(result)]))


@main.command()
@_STUDY
@click.argument("participant")
@click.argument("trial")
@click.option("--session", help="Which session, where the reader read the trial in several.")
@click.option("--region", "regions", multiple=True, help="Explain this region only; repeatable.")
@click.option("--measure", "measures", multiple=True, help="Explain this outcome only; repeatable.")
@click.option(
    "--picture",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Write a picture (FILE.svg), or a page with picture and explanation (FILE.html).",
)
@click.option(
    "--lines",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Write the line of each fixation into a table (FILE.csv) to be corrected by hand; to a "
    "table that is there, fixations that it lacks are added.",
)
@_QUIET
def trace(study: Path, participant: str, trial: str, *, quiet: bool, **wanted: Any) -> None:
    """Show one TRIAL of a PARTICIPANT, and why each outcome is what it is.

    PARTICIPANT and TRIAL are named as in the tables. A reader who has a pseudonym may be named by
    id too, and is shown by pseudonym.
    """
    loaded = etl.load_study(study)
    picture, lines = wanted["picture"], wanted["lines"]
    outcomes = Wanted(wanted["regions"], wanted["measures"])
    with _progress(quiet=quiet) as progress:
        traced = etl.trace(
            loaded,
            participant,
            trial,
            session=wanted["session"],
            workers=None,
            progress=progress,
        )
    if picture is not None:
        write_picture(traced, picture, outcomes)
        click.echo(f"Written to {picture}")
    if lines is not None:
        click.echo(write_lines(traced, lines, loaded))
    if picture is not None or lines is not None:
        return
    encoding = sys.stdout.encoding or "ascii"
    click.echo(explained(traced, shutil.get_terminal_size().columns, encoding, outcomes))


@main.command()
@_STUDY
@click.argument("variants", type=click.Path(path_type=Path))
@click.option(
    "--into",
    type=click.Path(path_type=Path),
    help="The output folder, instead of one beside VARIANTS with its name without the ending.",
)
@_WORKERS
@_QUIET
def vary(
    study: Path, variants: Path, into: Path | None, workers: int | None, *, quiet: bool
) -> None:
    """Compute the outcomes of STUDY under other decisions, side by side.

    VARIANTS is a small file that names alternatives for settings of STUDY: what is left out, how
    near a fixation must be to a region, and so on. All combinations are computed from the same
    fixations. Tables and a page say how far the binary outcomes hang on these decisions.
    """
    loaded = etl.load_study(study)
    with _progress(quiet=quiet) as progress:
        varied = etl.vary(loaded, variants, into=into, workers=workers, progress=progress)
    if not quiet:
        click.echo("\n".join([*varied.findings.lines(("warning",)), varied.told()]))


@main.command()
@click.argument(
    "name",
    required=False,
    shell_complete=lambda _context, _parameter, typed: [
        name for name in told.measure_names() if name.startswith(typed)
    ],
)
def measures(name: str | None) -> None:
    """Say what each outcome means, or one of them by NAME."""
    text = told.measure(name) if name else told.catalogue()
    if text is None:
        raise click.BadParameter(told.unknown_measure(name or ""), param_hint="NAME")
    click.echo(text)


@main.command()
@click.argument("shell", type=click.Choice(["bash", "zsh", "fish"]))
def completion(shell: str) -> None:
    """Print the lines that make SHELL complete this command."""
    kind = get_completion_class(shell)
    if kind is None:
        raise click.BadParameter(shell)
    click.echo(kind(main, {}, "trialwright", "_TRIALWRIGHT_COMPLETE").source())


@contextmanager
def _progress(*, quiet: bool) -> Iterator[Callable[[str, int, int], None]]:
    """A progress bar on stderr, only where that is a terminal."""
    if quiet or not sys.stderr.isatty():
        yield _heeding(lambda _stage, _done, _total: None)
        return
    columns = (
        TextColumn("{task.description}"),
        BarColumn(),
        MofNCompleteColumn(),
        TimeRemainingColumn(),
    )
    with Progress(*columns, console=Console(stderr=True), transient=True) as bars:
        stages: dict[str, Any] = {}

        def show(stage: str, done: int, total: int) -> None:
            if stage not in stages:
                stages[stage] = bars.add_task(stage, total=total)
            bars.update(stages[stage], completed=done)

        yield _heeding(show)


def run() -> NoReturn:
    """Run the command as a program."""
    main(prog_name="trialwright")
    sys.exit(0)


if __name__ == "__main__":
    run()
