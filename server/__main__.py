"""The program: ``python -m server VERB``."""

import os
import sys

from server.cli import Verbs, run
from server.settings import Settings


def main() -> None:
    """Do what the command line says and exit with its status."""
    try:
        status = run(sys.argv[1:], Verbs(serve=_serve))
        sys.stdout.flush()
    except BrokenPipeError:
        # whoever read along has closed its end: nothing more to say, and no noise about it
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        status = 1
    sys.exit(status)


def _serve(settings: Settings, demo: bool) -> int:
    """Start the server; the web is imported only where it is served."""
    from server.app import serve  # noqa: PLC0415 - evaluate and selfcheck start without the web

    return serve(settings, demo=demo)


if __name__ == "__main__":
    main()
