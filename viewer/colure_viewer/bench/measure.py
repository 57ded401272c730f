"""How a figure is measured and judged: medians in turn with their references, targets, and the JSON record."""

import statistics
import time
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from importlib.metadata import PackageNotFoundError, version
from typing import Any

Job = Callable[[], object]
"""A piece of work to be timed; what it returns is thrown away."""


@dataclass(frozen=True, slots=True)
class Target:
    """One condition on a figure.

    `kind` is "max" or "min" (the figure itself against `limit`), "x_faster" (reference over figure at least `limit`)
    or "x_floor" (figure over reference at most `limit`). `absent` says why a reference could not be measured.
    """

    kind: str
    limit: float
    reference: str = ""
    reference_value: float | None = None
    absent: str = ""

    def record(self, value: float) -> dict[str, Any]:
        """Return the JSON record of this target for a measured value."""
        ratio: float | None = None
        met: bool | None
        if self.kind == "max":
            met = value <= self.limit
        elif self.kind == "min":
            met = value >= self.limit
        elif self.reference_value is None:
            met = None
        elif self.kind == "x_faster":
            ratio = self.reference_value / value
            met = ratio >= self.limit
        else:
            ratio = value / self.reference_value
            met = ratio <= self.limit
        found: dict[str, Any] = {
            "kind": self.kind,
            "limit": self.limit,
            "reference": self.reference or None,
            "reference_value": self.reference_value,
            "ratio": ratio,
            "met": met,
        }
        if self.absent:
            found["absent"] = self.absent
        return found


@dataclass(frozen=True, slots=True)
class Accuracy:
    """What the speed was not bought with: the largest deviation from a reference, and its limit."""

    value: float
    unit: str
    limit: float
    reference: str


@dataclass(frozen=True, slots=True)
class Figure:
    """One measured figure with its targets."""

    value: float
    unit: str
    targets: tuple[Target, ...]
    error: Accuracy | None = None
    parts: Mapping[str, float] = field(default_factory=dict)

    def record(self) -> dict[str, Any]:
        """Return the JSON record."""
        found: dict[str, Any] = {
            "value": self.value,
            "unit": self.unit,
            "targets": [target.record(self.value) for target in self.targets],
        }
        if self.error is not None:
            found["error"] = {
                "value": self.error.value,
                "unit": self.error.unit,
                "limit": self.error.limit,
                "reference": self.error.reference,
                "met": self.error.value <= self.error.limit,
            }
        if self.parts:
            found["parts"] = dict(self.parts)
        return found


def in_turn(
    jobs: Mapping[str, Job], *, runs: int, warm: int = 2, seconds: float = 20.0, burst: int = 1
) -> dict[str, float]:
    """Return the median time of each job in milliseconds, the jobs run in turn so that a drifting machine is fair.

    Each job runs `warm` times uncounted, then up to `runs` times, or until `seconds` have been spent on all together
    (never fewer than three turns). At its turn a job runs `burst` times in a row, the first uncounted if there are
    more: work that follows itself in real life, as frames do, does not find the caches full of another job's data.
    """
    for job in jobs.values():
        for _ in range(warm):
            job()
    spent: dict[str, list[float]] = {name: [] for name in jobs}
    begun = time.perf_counter()
    for turn in range(max(runs // max(burst - 1, 1), 3)):
        for name, job in jobs.items():
            for number in range(burst):
                start = time.perf_counter()
                job()
                if number or burst == 1:
                    spent[name].append(1e3 * (time.perf_counter() - start))
        if turn >= 2 and time.perf_counter() - begun > seconds:
            break
    return {name: statistics.median(times) for name, times in spent.items()}


def installed(*names: str) -> str:
    """Return an empty string if all distributions are installed, else the sentence that says which is not."""
    for name in names:
        try:
            version(name)
        except PackageNotFoundError:
            return f"{name} is not installed"
    return ""


def versions() -> dict[str, str | None]:
    """Return the versions of everything that a figure can depend on; None where a library is absent."""
    found: dict[str, str | None] = {}
    for name in ("colure", "numpy", "pyerfa", "PySide6-Essentials", "pyqtgraph", "skyfield", "astropy", "jplephem"):
        try:
            found[name] = version(name)
        except PackageNotFoundError:
            found[name] = None
    return found


def machine() -> dict[str, Any]:
    """Return what the figures were measured on."""
    import os
    import platform

    model = platform.processor() or platform.machine()
    try:
        with open("/proc/cpuinfo", encoding="utf-8") as file:
            model = next(line.split(":", 1)[1].strip() for line in file if line.startswith("model name"))
    except (OSError, StopIteration):
        pass
    return {
        "platform": platform.platform(),
        "processor": model,
        "cores": os.cpu_count(),
        "python": platform.python_version(),
        "qt_platform": os.environ.get("QT_QPA_PLATFORM", ""),
    }
