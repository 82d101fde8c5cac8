"""The command: ``ductsolve solve CASE --out FOLDER``.

Nothing numeric is imported here, so that help answers at once; each verb imports what it needs.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Sequence
from contextlib import nullcontext
from pathlib import Path

import click

from ductsolve import __version__
from ductsolve.errors import DuctsolveError

SUCCESS, BAD_INPUT, FELL_SHORT, STOPPED = 0, 2, 3, 130
METHODS = ("newton", "picard")


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="ductsolve", message="%(prog)s %(version)s")
def cli() -> None:
    """Laminar flow of non-Newtonian fluids in ducts of any section.

    Every answer comes with two bounds between which the exact one is guaranteed to lie.
    """


@cli.command()
@click.argument("case", type=click.Path(path_type=Path))
@click.option("--out", metavar="FOLDER", help="Write result files there.")
@click.option("--accuracy", metavar="SHARE", help='Half-width asked of the bracket, e.g. "0.1 %" or 0.001.')
@click.option("--no-pictures", is_flag=True, help="Leave the pictures out, which is faster.")
@click.option(
    "--method",
    type=click.Choice(METHODS),
    default=METHODS[0],
    show_default=True,
    help="Newton, or Picard iteration on the apparent viscosity (slower, for comparison).",
)
@click.option(
    "--triangles",
    type=click.IntRange(min=1),
    metavar="NUMBER",
    help="Stop refining beyond so many triangles, to give up sooner or later than usual.",
)
def solve(
    case: Path, out: str | None, accuracy: str | None, no_pictures: bool, method: str, triangles: int | None
) -> int:
    """Solve the case file CASE: flow rate from pressure gradient, or the reverse.

    Prints the answer with its guaranteed bracket. With --out FOLDER it also writes result.json,
    wall_shear.csv, field.vtu, report.html and the pictures of section, velocity and wall shear.

    \b
    Exit code 0: answered to the accuracy asked, or no flow, proved.
              2: bad input; the reason is in one line.
              3: answered, but not to the accuracy asked.
    """
    from ductsolve.app import folder, job, summary, terminal
    from ductsolve.app.writing import file_names, files_block, write_files

    if out is not None and not out.strip():
        raise click.UsageError("--out is empty; name the folder to write to")
    pictures = not no_pictures
    with folder.staged(Path(out), file_names(pictures)) if out else nullcontext() as stage:
        with terminal.progress_on(sys.stderr) as progress:
            outcome = job.run(case, accuracy, method, triangles, progress)
        if stage:
            write_files(outcome, stage, pictures)
    if sys.stdout is None or not sys.stdout.isatty():  # the text on the terminal has them too
        for warning in summary.warning_block(outcome).notes:
            _say(f"ductsolve: {warning}", err=True)
    _say(terminal.report_of(outcome, files_block(Path(out), pictures) if out else None))
    return SUCCESS if outcome.settled else FELL_SHORT


def main(argv: Sequence[str] | None = None) -> int:
    """Run the command and give its exit code."""
    try:
        return cli.main(args=argv, prog_name="ductsolve", standalone_mode=False) or SUCCESS
    except click.Abort:
        _say("ductsolve: stopped; nothing was written", err=True)
        return STOPPED
    except click.exceptions.NoArgsIsHelpError as error:  # its message is the help page
        _say(error.format_message(), err=True)
        return BAD_INPUT
    except click.UsageError as error:
        hint = f" (try: {error.ctx.command_path} --help)" if error.ctx else ""
        return _refuse(error.format_message() + hint)
    except (click.ClickException, DuctsolveError) as error:
        return _refuse(str(error))
    except BrokenPipeError:  # whoever read the output has gone
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return SUCCESS
    except OSError as error:  # the output is full or closed
        return _refuse(f"the text could not be printed ({error.strerror})")


def _refuse(message: str) -> int:
    _say(f"ductsolve: {' '.join(message.split())}", err=True)
    return BAD_INPUT


def _say(text: str, err: bool = False) -> None:
    """Print, with a question mark for what the terminal's encoding lacks."""
    stream = sys.stderr if err else sys.stdout
    if stream is None:  # closed by whoever started the command
        return
    encoding = stream.encoding or "utf-8"
    click.echo(text.encode(encoding, "replace").decode(encoding), err=err)
