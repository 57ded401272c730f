"""What the tests of the viewer share: the made-up chart beside them, and the command line run in this process."""

import json
import sys
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))


class Ran:
    """What a command left: its exit code, and what it printed."""

    def __init__(self, code: int, out: str, err: str) -> None:
        self.code, self.out, self.err = code, out, err

    @property
    def records(self) -> list[dict]:
        return json.loads(self.out)


@pytest.fixture
def colure(capsys: pytest.CaptureFixture[str]):
    """Return a function that runs the command line in this process."""
    from colure_viewer.cli.main import main

    def run(*words: str) -> Ran:
        code = main(list(words))
        out, err = capsys.readouterr()
        return Ran(code, out, err)

    return run
