# SPDX-License-Identifier: GPL-3.0-or-later
"""The command line `halfplane`: one module a command, loaded when its command is asked for."""

import importlib
import sys
import traceback

import click

# Exit codes, the same for every command.
DONE, FAILED, BAD_USAGE, UNDECIDED = 0, 1, 2, 3
BROKEN = 70  # an error of ours: never to be taken for a link that failed

_COMMANDS = {
    "inspect": "facts about a constellation: distances, neighbours, symmetries, labels",
    "curve": "error rates against Es/N0: exact, bounds, approximation",
    "require": "the Es/N0 that a target error rate needs",
    "plan": "how many symbols a test of an error rate takes",
    "simulate": "count errors in seeded noise, beside the exact rate",
    "judge": "a recording, one sample a symbol: counted, explained, passed or failed",
    "describe": "SigMF metadata beside a file of samples",
    "report": "an acceptance report from logs: HTML, PDF or JSON",
    "watch": "a running link in a terminal, from its log or its page",
    "sets": "the constellations that have names",
}


class _Commands(click.Group):
    """A group that imports a command's module only when it is run, and lists them without importing any."""

    def list_commands(self, ctx):
        return list(_COMMANDS)

    def get_command(self, ctx, name):
        if name not in _COMMANDS:
            return None
        return importlib.import_module(f"{__name__}.{name}").command

    def format_commands(self, ctx, formatter):
        with formatter.section("Commands"):
            formatter.write_dl(list(_COMMANDS.items()))


def _print_version(ctx, param, asked):
    if asked and not ctx.resilient_parsing:
        from .. import core_python

        click.echo(f"halfplane {core_python.__version__}")
        ctx.exit()


@click.group(cls=_Commands, context_settings={"help_option_names": ["-h", "--help"]})
@click.option("--version", is_flag=True, is_eager=True, expose_value=False, callback=_print_version, help="Print the version.")
def halfplane():
    """Exact error rates of any two-dimensional constellation.

    SET, wherever it stands, is a name (see `halfplane sets`) or the path of a set file, JSON or CSV.
    RANGE is LO..HI/STEP with both ends in, or one number, in dB.

    Exit codes: 0 done, 1 judged and failed, 2 bad usage or input, 3 undecided.
    """


def run(arguments=None):
    """Runs the command line `halfplane` and ends the process."""
    run_command(halfplane, "halfplane", arguments)


def run_command(command, name, arguments=None):
    """Runs a click command and ends the process; every refusal is one line on stderr and exit code 2."""
    sys.stdout.reconfigure(errors="replace")  # a terminal that cannot show "≤" shows "?" and all the rest
    sys.exit(_run(command, name, arguments))


def _run(command, name, arguments):
    try:
        result = command.main(arguments, prog_name=name, standalone_mode=False)
        sys.stdout.flush()
        return result if isinstance(result, int) else DONE
    except click.exceptions.Exit as exit_:
        return exit_.exit_code
    except click.ClickException as refused:
        ctx = getattr(refused, "ctx", None)
        return _refuse(refused.format_message(), ctx.command_path if ctx is not None else name)
    except (ValueError, OSError) as refused:
        if isinstance(refused, BrokenPipeError):
            sys.stderr.close()  # the reader of a pipe has gone; nothing is left to say
            return DONE
        return _refuse(str(refused), name)
    except (KeyboardInterrupt, click.Abort):
        print(f"{name}: interrupted", file=sys.stderr)
        return 130
    except Exception:
        traceback.print_exc()
        return BROKEN


def _refuse(message, where):
    print(f"{where}: {' '.join(message.split())}", file=sys.stderr)
    return BAD_USAGE
