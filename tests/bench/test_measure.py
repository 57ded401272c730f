"""The benchmark's arithmetic: how a target is judged, and that every figure named is there to be measured."""

from importlib import import_module

import pytest

from colure_viewer.bench.measure import Accuracy, Figure, Target, in_turn, installed
from colure_viewer.cli.bench import FIGURES


@pytest.mark.parametrize(
    ("target", "value", "ratio", "met"),
    [
        (Target("max", 8.0), 8.0, None, True),
        (Target("max", 8.0), 8.1, None, False),
        (Target("min", 60.0), 59.0, None, False),
        (Target("x_faster", 25.0, "peer", 500.0), 20.0, 25.0, True),
        (Target("x_faster", 25.0, "peer", 499.0), 20.0, 24.95, False),
        (Target("x_floor", 2.0, "floor", 4.0), 8.0, 2.0, True),
        (Target("x_floor", 2.0, "floor", 4.0), 8.4, 2.1, False),
        (Target("x_faster", 25.0, "peer", None, "peer is not installed"), 20.0, None, None),
    ],
)
def test_a_target_is_judged_by_its_kind(target, value, ratio, met):
    record = target.record(value)
    assert record["ratio"] == (pytest.approx(ratio) if ratio is not None else None)
    assert record["met"] is met
    assert record.get("absent", "") == target.absent


def test_a_record_says_whether_speed_was_bought_with_accuracy():
    record = Figure(1.0, "ms", (), Accuracy(2.5, "mas", 2.0, "peer")).record()
    assert record["error"] == {"value": 2.5, "unit": "mas", "limit": 2.0, "reference": "peer", "met": False}


def test_jobs_run_in_turn_and_each_as_often():
    order = []
    in_turn({"a": lambda: order.append("a"), "b": lambda: order.append("b")}, runs=5, warm=1)
    assert order == ["a", "b"] + ["a", "b"] * 5


def test_an_absent_library_is_named():
    assert installed("numpy") == ""
    assert installed("numpy", "no-such-distribution-here") == "no-such-distribution-here is not installed"


@pytest.mark.parametrize("name", FIGURES)
def test_every_figure_named_can_be_measured(name, qapp):
    assert callable(getattr(import_module(f"colure_viewer.bench.{FIGURES[name]}"), name))


def test_one_figure_measured_for_real_has_the_documented_shape():
    from colure_viewer.bench.skies import cone_1deg

    record = cone_1deg().record()
    assert set(record) == {"value", "unit", "targets"}
    assert record["value"] > 0.0
    assert record["unit"] == "ms"
    assert set(record["targets"][0]) == {"kind", "limit", "reference", "reference_value", "ratio", "met"}
