"""What several test files need: a case of one object, and a run of the command line."""

import json
import os
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).parent.parent


def one(registry=None, *, flash=None, **fields):
    """Estimate one object; by default under LPL I."""
    from strikeenergy import estimate, make_case

    case = make_case({"flash": flash or {"threat": "LPL I"}, "object": [fields]}, registry=registry)
    return estimate(case).objects[0]


def strokes(**values):
    return {"stroke": [values]}


def command(*arguments, stdin=None, env=None, cwd=None, python=sys.executable):
    """Run ``python -m strikeenergy`` and return the finished process."""
    return subprocess.run(
        [python, "-m", "strikeenergy", *map(str, arguments)],
        input=stdin,
        capture_output=True,
        cwd=cwd or ROOT,
        env={**os.environ, **(env or {})},
        timeout=120,
        encoding=None if isinstance(stdin, bytes) else "utf-8",
    )


def as_json(*arguments, **more):
    done = command(*arguments, "--json", **more)
    assert done.returncode in (0, 1, 5), done.stderr
    return json.loads(done.stdout)
