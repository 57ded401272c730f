"""Start and memory figures, taken from outside: an interpreter to its first chart, beside an empty window."""

import os
import signal
import subprocess
import sys
import tempfile
import time
from functools import cache
from statistics import median

from colure_viewer.bench.measure import Figure, Target

RUNS = 7
IDLE_S = 10.0
EMPTY = """
import sys
import PySide6.QtWidgets as W
import numpy, erfa

class Empty(W.QWidget):
    def paintEvent(self, event):
        W.QWidget.paintEvent(self, event)
        print("painted", flush=True)

application = W.QApplication(sys.argv[:1])
window = Empty()
window.resize(1920, 1080)
window.show()
application.exec()
"""
COLURE = """
import gc
gc.disable()  # as the command does before it opens the window
from colure_viewer.app import application, start_collector, window
from dataclasses import replace
from PySide6.QtCore import QSettings
from colure.session import Session
from colure_viewer.chart import ChartWidget

paint = ChartWidget.paintEvent

def first(widget, event):
    paint(widget, event)
    print("painted", flush=True)
    ChartWidget.paintEvent = paint

# Told where the empty window is told: at the end of the painting, before the panels are made.
ChartWidget.paintEvent = first
made = application()
demo = Session.demo()
settings = QSettings("{settings}", QSettings.Format.IniFormat)
shown = window(replace(demo, view=replace(demo.view, limit_mag=6.5)), settings=settings)
shown.chart.painted.connect(start_collector)
shown.resize(1920, 1080)
shown.show()
made.exec()
"""


def _run(program: str, idle: float) -> tuple[float, float]:
    """Return seconds from the start of a process to its first painting, and its memory in MiB `idle` s after that."""
    environment = {**os.environ, "QT_QPA_PLATFORM": "offscreen", "OPENBLAS_NUM_THREADS": "1"}
    # As an installed program starts: from compiled bytecode, whatever the shell of the measurement forbids.
    environment.pop("PYTHONDONTWRITEBYTECODE", None)
    with tempfile.TemporaryDirectory() as folder:
        code = program.replace("{settings}", os.path.join(folder, "settings.ini"))
        begun = time.perf_counter()
        process = subprocess.Popen(
            [sys.executable, "-c", code],
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            env=environment,
            cwd=folder,
            text=True,
        )
        try:
            assert process.stdout is not None
            line = process.stdout.readline()
            spent = time.perf_counter() - begun
            if not idle:
                process.send_signal(signal.SIGSTOP)  # its memory as it is at this moment
            if line.strip() != "painted":
                process.kill()
                raise RuntimeError(f"the measured process ended before it painted: {process.communicate()[1][-400:]}")
            if idle:
                time.sleep(idle)
            return spent, _memory(process.pid)
        finally:
            process.kill()
            process.communicate()


def _memory(pid: int) -> float:
    """Return the resident memory of a process in MiB; NaN where the platform has no /proc."""
    try:
        with open(f"/proc/{pid}/status", encoding="ascii") as file:
            return next(float(line.split()[1]) / 1024.0 for line in file if line.startswith("VmRSS"))
    except OSError:
        return float("nan")


@cache
def _both() -> dict[str, tuple[float, float]]:
    """Return the medians of start (ms) and memory (MiB) of both programs, run in turn."""
    found: dict[str, list[tuple[float, float]]] = {"colure": [], "empty": []}
    for program in (COLURE, EMPTY):
        _run(program, 0.0)  # once uncounted, so that both find their files in the page cache
    for _ in range(RUNS):
        for name, program in (("colure", COLURE), ("empty", EMPTY)):
            found[name].append(_run(program, 0.0))
    return {
        name: (1e3 * median(run[0] for run in runs), median(run[1] for run in runs)) for name, runs in found.items()
    }


def start_first_chart() -> Figure:
    """Interpreter to the first painted chart with stars to V 6.5."""
    both = _both()
    target = Target("x_floor", 1.5, "empty window with QtWidgets, numpy and erfa", both["empty"][0])
    return Figure(both["colure"][0], "ms", (target,))


def memory_first_chart() -> Figure:
    """Resident memory at the first painted chart."""
    both = _both()
    target = Target("x_floor", 1.5, "empty window with QtWidgets, numpy and erfa", both["empty"][1])
    return Figure(both["colure"][1], "MiB", (target,))


def memory_idle() -> Figure:
    """Resident memory ten seconds later, with every panel."""
    value = _run(COLURE, IDLE_S)[1]
    return Figure(value, "MiB", (Target("x_floor", 2.0, "empty window, idle as long", _run(EMPTY, IDLE_S)[1]),))
