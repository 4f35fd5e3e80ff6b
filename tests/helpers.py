"""What several test files need: a case of one object, and a run of the command line."""

import contextlib
import io
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


class Done:
    """What a run of the command line left: code, output, messages."""

    def __init__(self, returncode, stdout, stderr):
        self.returncode, self.stdout, self.stderr = returncode, stdout, stderr


def command(*arguments, stdin=None):
    """Run the command line within this process, as a pipe sees it, and return what it left."""
    from strikeenergy.cli import run

    out, err = (io.TextIOWrapper(io.BytesIO(), encoding="utf-8") for _ in range(2))
    given = io.TextIOWrapper(io.BytesIO((stdin or "").encode()), encoding="utf-8")
    kept = sys.stdin, os.getcwd()
    try:
        sys.stdin = given
        os.chdir(ROOT)
        with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
            code = run([str(a) for a in arguments])
    finally:
        sys.stdin = kept[0]
        os.chdir(kept[1])
    texts = []
    for stream in (out, err):
        stream.flush()
        texts.append(stream.buffer.getvalue().decode("utf-8"))
    return Done(code, *texts)


def process(*arguments, stdin=None, env=None, cwd=None, python=sys.executable):
    """Run ``python -m strikeenergy`` as a process of its own and return it when finished."""
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
    """Run a command with --json and return what it printed."""
    done = command(*arguments, "--json", **more)
    assert done.returncode in (0, 1, 5), done.stderr
    return json.loads(done.stdout)
