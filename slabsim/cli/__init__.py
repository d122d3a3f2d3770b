"""The command `slabsim`: what the user types.

Commands import what they need inside their bodies, so that `slabsim --help` stays instant.
"""

import sys


def main() -> None:
    """Run the command line; an error of slabsim becomes one message and exit code 1."""
    from slabsim.cli.commands import app
    from slabsim.errors import SlabsimError, StackError, SweepInterrupted

    try:
        app()
    except SweepInterrupted as stop:
        print(stop, file=sys.stderr)
        sys.exit(130)
    except StackError as error:
        count = len(error.faults)
        print(error, file=sys.stderr)
        if count > 1:
            print(f"{count} faults; nothing was computed", file=sys.stderr)
        sys.exit(1)
    except SlabsimError as error:
        print(f"error: {error}", file=sys.stderr)
        sys.exit(1)
    except OSError as error:  # a full disk behind the standard output; files have errors of their own
        print(f"error: {error.filename or 'the output'} cannot be written ({error.strerror})", file=sys.stderr)
        sys.exit(1)
