"""Lay the lines of several layers on the page in one pass: each prepares its curves, all are traced, each finishes."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from colure.clipping import Trace, trace
from colure.marks import I32, Layer
from colure.projections import Real
from colure.scene.context import Context


@dataclass(frozen=True, slots=True, eq=False)
class Strokes:
    """Curves of a layer: camera directions (3, N) with `starts`, and what makes the layer of them once they are traced.

    `finish` gets the layer's own part of the trace, its points counted from 0.
    """

    camera: Real
    starts: I32
    finish: Callable[[Trace], tuple[Layer, Any]]


def draw(ctx: Context, layers: list[tuple[str, object, Callable[[], Strokes]]]) -> None:
    """Add layers of lines, each (name, key, prepare); those of the scene before are kept while their key is equal."""
    fresh: list[tuple[str, Strokes]] = []
    for name, key, prepare in layers:
        old = ctx.previous.get(name)
        if old is not None and old[0].key == key:
            ctx.made[name] = old
        else:
            fresh.append((name, prepare()))
    fresh_starts: list[I32] = []
    at = 0
    for _, strokes in fresh:
        fresh_starts.append(strokes.starts[:-1] + at)
        at += strokes.camera.shape[1]
    if not at:
        for name, strokes in fresh:
            ctx.made[name] = strokes.finish(Trace.nothing())
        return
    # The starts of all, and the end of the last.
    starts = np.concatenate([*fresh_starts, [at]]).astype(np.int32)
    camera = fresh[0][1].camera if len(fresh) == 1 else np.concatenate([s.camera for _, s in fresh], axis=1)
    whole = trace(ctx.window, camera, starts)
    at = 0
    for name, strokes in fresh:
        n = strokes.camera.shape[1]
        ctx.made[name] = strokes.finish(whole.part(at, at + n))
        at += n
