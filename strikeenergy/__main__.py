"""Start the command line: ``python -m strikeenergy``."""

from __future__ import annotations

import sys


def main() -> None:
    """Answer ``--version`` at once; hand everything else to the command line."""
    if sys.argv[1:] == ["--version"]:
        from strikeenergy.version import __version__

        print(f"strikeenergy {__version__}")
        return
    from strikeenergy.cli import run

    sys.exit(run())


if __name__ == "__main__":
    main()
