"""The command line: parsing, and how errors and results end as exit codes; nothing else.

Exit codes: 0 done, 1 a check failed, 2 the input is wrong, 3 the run could not go on,
130 interrupted and resumable. Whatever is heavy is imported inside the command that needs it.
"""

from __future__ import annotations

import logging
import math
import signal
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from bemwave import __version__
from bemwave.errors import BemwaveError, InputError, NotYetError

if TYPE_CHECKING:
    from bemwave.records import Verdict

_file = click.Path(path_type=Path)
_anything = {"ignore_unknown_options": True, "allow_extra_args": True}


def _above_0(context: click.Context, option: click.Parameter, value: float | None) -> float | None:
    if value is not None and not (value > 0 and math.isfinite(value)):
        raise click.BadParameter(f"got {value:g}, expected a number above 0", context, option)
    return value


class _Interrupted(Exception):
    """Ctrl-C with what to do next, kept from click, which would print an empty line before it."""


class _Commands(click.Group):
    def invoke(self, context: click.Context) -> Any:
        try:
            return super().invoke(context)
        except KeyboardInterrupt:
            raise _Interrupted("interrupted") from None


@click.group(cls=_Commands, invoke_without_command=True)
@click.version_option(__version__, prog_name="bemwave")
@click.pass_context
def commands(context: click.Context) -> None:
    """Far-field ocean waves round ships and platforms, for near-field solvers and renderers."""
    if context.invoked_subcommand is None:
        click.echo(context.get_help())


@commands.command()
@click.argument("folder", type=_file)
def new(folder: Path) -> None:
    """Write a commented case that runs into FOLDER (new, or empty)."""
    from bemwave.case.starter import write_starter

    case = write_starter(folder)
    click.echo(f"wrote {case}; next: bemwave plan {case}")


@commands.command()
@click.argument("file", type=_file)
@click.option("--cut", is_flag=True, help="Cut at still water and keep what is below.")
@click.option("--panel-size", type=float, callback=_above_0, help="Remesh to this size, m.")
@click.option("--up", type=click.Choice(["x", "y", "z"]), help="The file's up axis [z].")
@click.option("--scale", type=float, callback=_above_0, help="Metres in the file's unit [1].")
@click.option("--draught", type=float, callback=_above_0, help="Depth of the lowest point, m.")
@click.option("--out", type=_file, help="Write the prepared mesh here, waterline at z = 0.")
def mesh(file: Path, out: Path | None, **how: Any) -> int:
    """Inspect a hull file: dimensions, volume, centres, faults; exit 1 if there are faults."""
    from bemwave.geometry.files import write_mesh
    from bemwave.geometry.inspection import inspect_hull

    found = inspect_hull(file, **how)
    parts = [("part " + name, str(count), "triangles") for name, count in found.parts.items()]
    click.echo(_columns([*found.rows(), *(parts if len(parts) > 1 else [])]))
    for note in found.notes:
        click.echo(f"note: {note}")
    for fault in found.faults:
        click.echo(f"fault: {fault}")
    if not found.faults:
        click.echo("no faults found")
    if out is not None:
        write_mesh(found.mesh, out)
        click.echo(f"wrote {out}")
    return 1 if found.faults else 0


@commands.command()
@click.argument("case", type=_file)
@click.option("--picture", type=_file, help="Draw the plan of the case into this PNG.")
def plan(case: Path, picture: Path | None) -> None:
    """Say what CASE will take and how good it will be; solves nothing."""
    from bemwave.case import read_case

    asked = read_case(case)
    from bemwave.running import plan as forecast

    click.echo(forecast(asked, picture=picture))


@commands.command()
@click.argument("case", type=_file)
@click.option("--out", type=_file, help="The run folder; default: CASE without .toml, plus -run.")
@click.option("--resume", is_flag=True, help="Go on from the last checkpoint.")
@click.option("--couple", type=_file, help="Couple live to a near-field solver.")
def run(case: Path, out: Path | None, resume: bool, couple: Path | None) -> None:
    """Solve CASE and write its run folder; Ctrl-C leaves a run that --resume goes on with."""
    from bemwave.case import read_case

    if couple is not None:
        raise NotYetError("not yet: --couple comes with a later version; leave it out")
    asked = read_case(case)
    from bemwave.handoff.writer import CAUTION
    from bemwave.records import default_folder, read_checks
    from bemwave.running import run as solve

    folder = out or default_folder(case)
    again = f"bemwave run {case} --resume" + (f" --out {out}" if out else "")
    _tell_what_goes_on()
    try:
        finished = solve(asked, folder, resume=resume)
    except KeyboardInterrupt:
        raise _Interrupted(f"interrupted; go on with: {again}") from None
    click.echo(f"run folder: {folder}")
    click.echo(_verdicts(read_checks(finished.folder.checks)))
    click.echo(CAUTION)


def _tell_what_goes_on() -> None:
    """Show the lines of the log, as they come, above the results."""
    shown = logging.StreamHandler(sys.stdout)
    shown.setFormatter(logging.Formatter("%(message)s"))
    logging.getLogger("bemwave").handlers = [shown]


@commands.command()
@click.argument("run", type=_file)
@click.option("--convergence", is_flag=True, help="Solve again at 1.5 x spacing and compare.")
def check(run: Path, convergence: bool) -> int:
    """Judge RUN by its checks, each with its figure and limit; exit 1 if one fails."""
    from bemwave.running import check as judge

    verdicts = judge(run, convergence=convergence)
    click.echo(_verdicts(verdicts))
    return 1 if any(verdict.verdict == "fail" for verdict in verdicts) else 0


def _times(context: click.Context, option: click.Parameter, text: str) -> list[float]:
    try:
        return [float(word) for word in text.split(",") if text]
    except ValueError:
        raise click.BadParameter(
            f"got {text}, expected seconds such as 10,20", context, option
        ) from None


@commands.command()
@click.argument("run", type=_file)
@click.option("--times", default="", callback=_times, help="Map the surface at these, s: 10,20.")
def report(run: Path, times: list[float]) -> None:
    """Write RUN/report.html, one page about RUN; also of a run that still goes on."""
    from bemwave.report import write_report

    click.echo(f"wrote {write_report(run, times)}")


def _verdicts(verdicts: Sequence[Verdict]) -> str:
    """A table of name, figure, limit, verdict and where the limit comes from."""
    rows: list[tuple[str, ...]] = [("check", "figure", "limit", "verdict", "source")]
    for v in verdicts:
        figures = ("-" if number is None else f"{number:.3g}" for number in (v.figure, v.limit))
        rows.append((v.name, *figures, v.verdict, v.source))
    return _columns(rows)


def _columns(rows: Sequence[tuple[str, ...]]) -> str:
    """Rows of words as columns of equal width."""
    widths = [max(map(len, column)) for column in zip(*rows, strict=True)]
    lines = ("  ".join(map(str.ljust, row, widths)).rstrip() for row in rows)
    return "\n".join(lines)


def _comes_later(name: str, does: str) -> None:
    @commands.command(name, help=f"{does} (not yet)", context_settings=_anything)
    @click.argument("arguments", nargs=-1, type=click.UNPROCESSED)
    def later(arguments: tuple[str, ...]) -> None:
        raise NotYetError(f"not yet: `bemwave {name}` comes with a later version")


_comes_later("sample", "Take a new hand-off from a finished run.")
_comes_later("response", "Added mass, damping, loads and motions by period.")
_comes_later("compare", "Compare near-field gauge records with a run.")
_comes_later("sweep", "Many runs of one case.")


def status_of(arguments: Sequence[str] | None = None) -> int:
    """Run a command line and return its exit code; every error is one message on stderr."""
    try:
        status = commands.main(arguments, prog_name="bemwave", standalone_mode=False)
        return status if isinstance(status, int) else 0
    except click.ClickException as error:
        context = getattr(error, "ctx", None)
        path = context.command_path if context else "bemwave"
        return _fail(f"{error.format_message().rstrip('.')}; see {path} --help", 2)
    except BemwaveError as error:
        return _fail(str(error), error.exit_code)
    except _Interrupted as error:
        return _fail(str(error), 130)
    except MemoryError:
        return _fail("the machine has no memory left; see bemwave plan for what a case needs", 3)
    except OSError as error:
        return _fail(f"{error.filename or 'file'}: {error.strerror or error}", InputError.exit_code)


def _fail(message: str, status: int) -> int:
    click.echo(f"error: {message}", err=True)
    return status


def main() -> None:
    """The `bemwave` command."""
    signal.signal(signal.SIGTERM, signal.default_int_handler)  # ends things as Ctrl-C does
    sys.exit(status_of())
