"""Shared test set-up: one BLAS thread, no display, and no widget that outlives its test."""

import gc
import os
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
sys.path.insert(0, str(Path(__file__).parent / "checks"))  # `import harness` from every topic's module


@pytest.fixture(autouse=True)
def _no_stray_widgets(request: pytest.FixtureRequest) -> Iterator[None]:
    if "qapp" not in request.fixturenames:
        yield
        return
    from PySide6.QtCore import QCoreApplication, QEvent
    from PySide6.QtWidgets import QApplication

    before = set(QApplication.topLevelWidgets())
    yield
    QCoreApplication.sendPostedEvents(None, QEvent.Type.DeferredDelete)
    gc.collect()
    stray = set(QApplication.topLevelWidgets()) - before
    assert not stray, f"top-level widgets outlived the test: {stray}"
