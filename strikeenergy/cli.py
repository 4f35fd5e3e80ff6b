"""The command line. Imports click and nothing heavy: each command brings in what it needs when it runs."""

from __future__ import annotations

import os
import shlex
import sys
import tempfile
import traceback
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from strikeenergy.errors import ExitCode, InputError, StrikeEnergyError
from strikeenergy.version import __version__

if TYPE_CHECKING:
    from strikeenergy.errors import PluginError
    from strikeenergy.registry import Registry

__all__ = ["main", "run"]


class _Group(click.Group):
    """Lists commands in the order of a first visit, and says what was perhaps meant."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(self.commands)


@click.group(cls=_Group, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, message="%(prog)s %(version)s", prog_name="strikeenergy")
def main() -> None:
    """What a lightning current does to the thing it strikes, in numbers that can be checked.

    \b
    Begin with
      strikeenergy new conductor -o part.toml
      strikeenergy estimate part.toml

    An estimate, not a design approval: local codes and the authority having jurisdiction come first.
    Nothing is sent anywhere: the program uses no network.
    """


def run(arguments: list[str] | None = None) -> int:
    """Run the command line and return the exit code. The one place where errors become codes."""
    for name in ("stdin", "stdout", "stderr"):
        if getattr(sys, name) is None:  # closed by whoever started the program
            setattr(sys, name, open(os.devnull, "r" if name == "stdin" else "w"))  # noqa: SIM115
    for stream in (sys.stdout, sys.stderr):
        reconfigure = getattr(stream, "reconfigure", None)
        if reconfigure is not None:  # a redirected stream may have another encoding, which has no Ω
            reconfigure(encoding="utf-8")
    try:
        value = main.main(args=arguments, prog_name="strikeenergy", standalone_mode=False)
        sys.stdout.flush()
        return int(value) if isinstance(value, int) else int(ExitCode.OK)
    except click.exceptions.Exit as stop:
        return stop.exit_code
    except click.Abort:
        click.echo("Interrupted.", err=True)
        return 130
    except click.ClickException as error:
        error.show()
        return error.exit_code
    except StrikeEnergyError as error:
        click.echo(str(error), err=True)
        return int(error.exit_code)
    except BrokenPipeError:  # the reader has gone, as with "| head"
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return int(ExitCode.OK)
    except KeyboardInterrupt:
        click.echo("Interrupted.", err=True)
        return 130
    except OSError as error:
        click.echo(f"The output cannot be written: {error.strerror or error}", err=True)
        return int(ExitCode.MISUSE)
    except Exception as error:
        if os.environ.get("STRIKEENERGY_TRACEBACK"):
            traceback.print_exc()
        click.echo(
            f"This is a fault of the program, not of your input: {type(error).__name__}: {error}\n"
            "Set STRIKEENERGY_TRACEBACK=1 and run it again for the details to report.",
            err=True,
        )
        return int(ExitCode.FAULT)


def _show_failures(failures: list[PluginError]) -> None:
    for failure in failures:
        click.echo(f"warning: {failure}", err=True)


def _write(text: str, output: str | None, force: bool = False) -> None:
    """Write to standard output, or to a file: whole or not at all."""
    if output is None or output == "-":
        click.echo(text, nl=False)
        return
    target = Path(output)
    if target.exists() and not force:
        raise click.UsageError(f"{output} exists; name another file or give --force")
    try:
        if target.exists() and not target.is_file():  # a device or a pipe is written to, not replaced
            target.write_text(text, encoding="utf-8")
            return
        target = target.resolve()
        with tempfile.NamedTemporaryFile("w", encoding="utf-8", dir=target.parent, delete=False) as beside:
            try:
                beside.write(text)
                beside.close()
                Path(beside.name).chmod(0o644)
                Path(beside.name).replace(target)
            except BaseException:
                Path(beside.name).unlink(missing_ok=True)
                raise
    except OSError as error:
        raise click.UsageError(
            f"{output or 'the output'} cannot be written: {error.strerror or error}"
        ) from None


@main.command()
@click.argument("case", metavar="CASE")
@click.option("--text", "form", flag_value="text", help="For people (the default on a terminal).")
@click.option("--json", "form", flag_value="json", help="One JSON object in SI units, keys sorted.")
@click.option("--csv", "form", flag_value="csv", help="One record a line (the default when piped).")
@click.option(
    "--notes", is_flag=True, help="The calculation notes as well: formulas, values put in, sources."
)
@click.option("--threat", metavar="NAME", help="Take this threat instead of the flash of the case.")
@click.option("--standard", metavar="NAME", help="The standard that decides, instead of that of the case.")
@click.option("--strict-plugins", is_flag=True, help="Stop at once if a plugin failed to load.")
def estimate(
    case: str, form: str | None, notes: bool, threat: str | None, standard: str | None, strict_plugins: bool
) -> int:
    """Estimate what the flash of a CASE does to each of its objects, and judge it.

    CASE is a TOML file, or - for standard input.

    \b
    Exit codes: 0 nothing falls short, 1 something falls short, 2 misused, 3 input refused,
    4 no model covers it, 5 a plugin failed (the rest stands), 70 a fault of the program.

    \b
    Examples:
      strikeenergy estimate cases/boathouse.toml --text
      strikeenergy estimate cases/boathouse.toml --threat "LPL II" --json
    """
    from strikeenergy import case as cases
    from strikeenergy import engine
    from strikeenergy.registry import load

    if notes and form == "csv":
        raise click.UsageError("--notes goes with --text or --json")
    try:
        loaded = cases.load_case(case, threat=threat, standard=standard)
    except InputError:  # a plugin that failed may be the reason
        _show_failures(load().failures)
        raise
    if strict_plugins and loaded.registry.failures:
        raise loaded.registry.failures[0]
    result = engine.estimate(loaded)
    form = form or ("text" if sys.stdout.isatty() or notes else "csv")
    if form == "json":
        from strikeenergy.report.machine import to_json

        data = result.to_dict()
        if notes:
            from strikeenergy.report.text import notes_text

            data["notes"] = notes_text(result).splitlines()
        _write(to_json(data), None)
    elif form == "csv":
        from strikeenergy.report.machine import to_csv

        _write(to_csv(result), None)
    else:
        from strikeenergy.report.terminal import show
        from strikeenergy.report.text import estimate_text, notes_text

        show(estimate_text(result))
        if notes:
            show("\n" + notes_text(result))
    _show_failures(result.all_failures)
    return int(result.exit_code)


@main.command()
@click.argument("file", metavar="FILE")
@click.option("--text", "form", flag_value="text", help="For people (the default on a terminal).")
@click.option("--json", "form", flag_value="json", help="One JSON object in SI units, keys sorted.")
@click.option("--csv", "form", flag_value="csv", help="One quantity a line (the default when piped).")
@click.option("--channel", metavar="NAME", help="Name or number of the column, where there are several.")
@click.option("--time-unit", metavar="UNIT", help='Unit of the times, such as "us".')
@click.option("--current-unit", metavar="UNIT", help='Unit of the current, such as "kA".')
@click.option("--scale", metavar="SCALE", help='What one unit stands for: "10 kA/V", "0.25 mohm" (a shunt).')
@click.option("--time-step", metavar="TIME", help="Time between samples, where the file holds no times.")
@click.option(
    "--sensor-time-constant", metavar="TIME", help="Repair the droop of a sensor without d.c. response."
)
@click.option("--baseline", nargs=2, metavar="FROM TO", help="Window that holds no current, for the offset.")
@click.option("--polarity", type=click.Choice(["positive", "negative"]), help="Instead of that of the peak.")
@click.option("--spec", metavar="NAME", help="Hold it against the tolerances of a test.")
@click.option("--tolerance", metavar="NAME", help="Which tolerance, where sources differ.")
@click.option("--peak", metavar="CURRENT", help="Nominal peak, for shapes such as 8/20.")
@click.option("--plot", metavar="FILE", help="Draw current, charge and W/R over time (SVG).")
@click.option("--force", is_flag=True, help="Replace the plot if it exists.")
def record(
    file: str,
    form: str | None,
    baseline: tuple[str, str] | None,
    polarity: str | None,
    sensor_time_constant: str | None,
    spec: str | None,
    tolerance: str | None,
    peak: str | None,
    plot: str | None,
    force: bool,
    **options: str | None,
) -> int:
    """Reduce the oscillogram in FILE to peak, T1, T2, charge and specific energy, each with its uncertainty.

    FILE is text: columns with or without a heading, comma, semicolon, tab or blank between them. Units are taken
    from the heading or given; they are never guessed. With --spec the exit code is 1 where a quantity is outside.
    'strikeenergy describe specifications' lists the tests.

    \b
    Examples:
      strikeenergy record cases/mast-shot.csv --scale "10 kA/V" --text
      strikeenergy record cases/mast-shot.csv --scale "10 kA/V" --spec "LPL III first positive impulse"
    """
    from strikeenergy.lightning import record as reading
    from strikeenergy.lightning.reduction import reduce
    from strikeenergy.lightning.tolerances import check
    from strikeenergy.report import recorded
    from strikeenergy.report.machine import to_json
    from strikeenergy.report.terminal import show

    if not spec and (tolerance or peak):
        raise click.UsageError("--tolerance and --peak go with --spec")
    source = sys.stdin.buffer if file == "-" else file
    given: dict[str, Any] = {name: value for name, value in options.items() if value is not None}
    read = reading.read_record(source, **given)
    sign = None if polarity is None else 1 if polarity == "positive" else -1
    reduction = reduce(
        read, sensor_time_constant=sensor_time_constant, polarity=sign, baseline=baseline or None
    )
    held = check(reduction, spec, tolerance, peak=peak) if spec else []
    if plot:
        from strikeenergy.lightning.record_plot import write_record_svg

        if Path(plot).exists() and not force:
            raise click.UsageError(f"{plot} exists; name another file or give --force")
        try:
            write_record_svg(reduction, plot)
        except OSError as error:
            raise click.UsageError(f"{plot} cannot be written: {error.strerror or error}") from None
    form = form or ("text" if sys.stdout.isatty() else "csv")
    if form == "json":
        _write(to_json(recorded.record_data(read, reduction, held)), None)
    elif form == "csv":
        _write(recorded.record_csv(reduction, held), None)
    else:
        show(recorded.record_text(read, reduction, held, spec or ""))
    return int(ExitCode.FALLS_SHORT if any(r.outcome == "fail" for r in held) else ExitCode.OK)


@main.command()
@click.argument("kind", metavar="KIND")
@click.option("-o", "--output", metavar="FILE", help="Write to a file (UTF-8) instead of standard output.")
@click.option("--force", is_flag=True, help="Replace the file if it exists.")
def new(kind: str, output: str | None, force: bool) -> int:
    """Write a commented case with one object of a KIND, to start from.

    \b
    Examples:
      strikeenergy new conductor
      strikeenergy new sheet -o sheet.toml
    """
    from strikeenergy.newcase import new_case
    from strikeenergy.registry import load

    registry = load()
    _show_failures(registry.failures)
    _write(new_case(registry, kind), output, force)
    if output not in (None, "-"):
        click.echo(f"Wrote {output}. Next: strikeenergy estimate {shlex.quote(str(output))}", err=True)
    return _load_code(registry)


@main.command()
@click.argument("subject", required=False, default="", metavar="[SUBJECT]")
@click.argument("name", required=False, default="", metavar="[NAME]")
@click.option("--json", "as_json", is_flag=True, help="One JSON object instead of text.")
def describe(subject: str, name: str, as_json: bool) -> int:
    """Describe what the program knows, with the source and standing of each number.

    \b
    SUBJECT is kinds, materials, threats, shapes, populations, specifications, tables, standards or
    sources; a KIND; or kind, material, threat, population, specification or table with a NAME.

    \b
    Examples:
      strikeenergy describe
      strikeenergy describe conductor
      strikeenergy describe material copper
      strikeenergy describe threat "LPL I"
      strikeenergy describe table "IEC 62305-3:2010 Table 6"
    """
    from strikeenergy.describe import describe as told
    from strikeenergy.registry import load
    from strikeenergy.report.machine import to_json
    from strikeenergy.report.terminal import show

    registry = load()
    _show_failures(registry.failures)
    pages = told(registry, subject, name)
    if as_json:
        _write(to_json({"schema_version": 1, "sections": [page.to_dict() for page in pages]}), None)
    else:
        show("\n".join(page.text() for page in pages))
    return _load_code(registry)


@main.command()
@click.option("-o", "--output", metavar="FILE", help="Write to a file instead of standard output.")
@click.option("--force", is_flag=True, help="Replace the file if it exists.")
def schema(output: str | None, force: bool) -> int:
    """Write the JSON schema of case files, for completion and checks in an editor.

    Put it beside your cases as strikeenergy-case.schema.json: the first line of every new case names it.

    \b
    Example:
      strikeenergy schema -o strikeenergy-case.schema.json
    """
    from strikeenergy.newcase import case_schema
    from strikeenergy.registry import load
    from strikeenergy.report.machine import to_json

    registry = load()
    _show_failures(registry.failures)
    _write(to_json(case_schema(registry)), output, force)
    return _load_code(registry)


@main.command()
@click.option("--json", "as_json", is_flag=True, help="One JSON object instead of text.")
def plugins(as_json: bool) -> int:
    """List what is installed, from which distribution, and what failed and where.

    \b
    Example:
      strikeenergy plugins
    """
    from strikeenergy.describe import plugin_data, plugin_pages
    from strikeenergy.registry import load
    from strikeenergy.report.machine import to_json
    from strikeenergy.report.terminal import show

    registry = load()
    if as_json:
        _write(to_json(plugin_data(registry)), None)
    else:
        show("\n".join(page.text() for page in plugin_pages(registry)))
    return _load_code(registry)


def _load_code(registry: Registry) -> int:
    return int(ExitCode.PLUGIN if registry.failures else ExitCode.OK)
