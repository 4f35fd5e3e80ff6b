"""What `strikeenergy.lightning` offers, whatever was imported before."""

import subprocess
import sys

import pytest

from strikeenergy import lightning


def test_every_name_is_there():
    assert {"Heidler", "fit", "population", "reduce", "read_record", "threat"} <= set(dir(lightning))
    for name in lightning.__all__:
        assert callable(getattr(lightning, name)), name
    with pytest.raises(AttributeError, match="no attribute 'heidler'"):
        _ = lightning.heidler


def test_importing_it_is_light():
    script = "import strikeenergy.lightning, sys; assert 'numpy' not in sys.modules; from strikeenergy.lightning import Heidler; print(Heidler(1e5, 19e-6, 485e-6).peak)"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True)
    assert done.stdout.startswith("100000"), done.stderr
