"""`python -m explorer` opens the page; a further command is one more parser and its function."""

import argparse
import sys
from collections.abc import Sequence

from explorer import sweep_command


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command line; returns the exit code (2: asked for something that cannot be done)."""
    chosen = _parser().parse_args(arguments)
    code: int = chosen.run(chosen)
    return code


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="python -m explorer",
        description="Open the explorer's page in the browser, served to this machine only.",
    )
    parser.add_argument(
        "--port",
        type=_port,
        default=0,
        metavar="N",
        help="port to serve on (a free one if left out)",
    )
    parser.add_argument(
        "--no-browser", action="store_true", help="print the address and open no browser"
    )
    parser.set_defaults(run=open_page)
    commands = parser.add_subparsers(title="commands", metavar="COMMAND")
    sweep = commands.add_parser("sweep", help="write a table of many designs from a plan in a file")
    sweep_command.add_options(sweep)
    sweep.set_defaults(run=sweep_command.run)
    return parser


def _port(text: str) -> int:
    if not (text.isascii() and text.isdigit() and int(text) <= 65535):
        raise argparse.ArgumentTypeError(f"a port is a whole number from 0 to 65535, not {text!r}")
    return int(text)


def open_page(chosen: argparse.Namespace) -> int:
    """Serve the page until it is stopped."""
    from explorer.serve import CannotServe, serve

    try:
        serve(port=chosen.port, open_browser=not chosen.no_browser)
    except CannotServe as reason:
        print(reason, file=sys.stderr)
        return 2
    return 0


if __name__ == "__main__":
    sys.exit(main())
