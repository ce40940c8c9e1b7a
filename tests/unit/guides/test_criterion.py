"""Classes by direction, limits, spans in words; and the catalogue that scenarios name."""

from __future__ import annotations

from typing import get_args

import pytest

from crowdsim.guides.catalogue import CRITERIA
from crowdsim.guides.criterion import Band, Criterion
from crowdsim.scenario.schema import ComfortTable

THREE = Criterion(
    key="oxmere",
    title="Oxmere (1931)",
    source="invented",
    classes=("calm", "lively", "wild"),
    words=("one sits", "one stands", "one holds on"),
    bounds={"vertical": (0.4, 1.2), "lateral": (0.1, 0.25)},
)
LIMIT = Criterion(
    key="quay", title="Quay", source="invented", classes=(), words=(), bounds={"vertical": (0.9,)}, notes={}
)  # fmt: skip


@pytest.mark.parametrize(
    ("value", "direction", "name"),
    [
        (0.0, "vertical", "calm"), (0.39999, "vertical", "calm"), (0.4, "vertical", "lively"),
        (1.19999, "vertical", "lively"), (1.2, "vertical", "wild"), (50.0, "vertical", "wild"),
        (0.2, "vertical", "calm"), (0.2, "lateral", "lively"), (0.25, "lateral", "wild"),
        (0.2, "longitudinal", None),
    ],
)  # fmt: skip
def test_class_of_a_value(value: float, direction: str, name: str | None) -> None:
    assert THREE.classify(value, direction) == name


def test_a_limit_gives_no_class() -> None:
    assert LIMIT.classify(0.1, "vertical") is None
    assert LIMIT.classify(2.0, "vertical") is None


def test_limit_of_a_class() -> None:
    assert THREE.limit("vertical", "calm") == 0.4
    assert THREE.limit("vertical", "lively") == 1.2
    assert THREE.limit("lateral", "lively") == 0.25
    assert THREE.limit("longitudinal", "lively") is None
    assert THREE.limit("longitudinal", "nonsense") is None  # the source has nothing to say of any class there


def test_the_one_limit_needs_no_class() -> None:
    assert LIMIT.limit("vertical") == 0.9
    assert LIMIT.limit("lateral") is None


@pytest.mark.parametrize("target", ["wild", "Calm", "", None])
def test_a_class_that_nobody_can_aim_at(target: str | None) -> None:
    with pytest.raises(ValueError, match=r"no class of Oxmere \(1931\) to aim at: calm, lively"):
        THREE.limit("vertical", target)


def test_reachable_classes() -> None:
    assert THREE.reachable == ("calm", "lively")
    assert LIMIT.reachable == ()


@pytest.mark.parametrize(
    ("name", "direction", "text"),
    [
        ("calm", "vertical", "below 0.40 m/s2"),
        ("lively", "vertical", "0.40 to below 1.20 m/s2"),
        ("wild", "vertical", "1.20 m/s2 and above"),
        ("lively", "lateral", "0.10 to below 0.25 m/s2"),
    ],
)
def test_a_class_as_a_span(name: str, direction: str, text: str) -> None:
    assert THREE.range_text(name, direction) == text


@pytest.mark.parametrize(
    ("name", "direction", "error"), [("mild", "vertical", ValueError), ("calm", "longitudinal", KeyError)]
)
def test_no_span_without_a_class(name: str, direction: str, error: type[Exception]) -> None:
    with pytest.raises(error):
        THREE.range_text(name, direction)


def test_a_band_holds_both_ends() -> None:
    band = Band(1.25, 2.3, 1, "invented")
    assert [band.holds(f) for f in (1.2499, 1.25, 2.0, 2.3, 2.3001)] == [False, True, True, True, False]
    assert band.gait == "walking"


def test_the_catalogue_is_what_a_scenario_may_name() -> None:
    named = get_args(ComfortTable.model_fields["criterion"].annotation)
    assert set(named) == set(CRITERIA)
    assert len(named) == len(CRITERIA)
    assert all(CRITERIA[key].key == key for key in named)


@pytest.mark.parametrize("key", CRITERIA)
def test_every_criterion_fits_together(key: str) -> None:
    one = CRITERIA[key]
    assert one.title
    assert "from memory" in one.source
    assert len(one.words) == len(one.classes)
    assert "vertical" in one.bounds
    for direction, bounds in one.bounds.items():
        assert direction in ("vertical", "lateral", "longitudinal")
        assert len(bounds) == max(len(one.classes) - 1, 1)
        assert list(bounds) == sorted(set(bounds))
        assert bounds[0] > 0.0
    for bands in one.bands.values():
        for band in bands:
            assert band.low < band.high
            assert band.harmonic in (1, 2)
            assert band.gait in ("walking", "jogging")
    for name in one.classes:
        assert one.range_text(name, "vertical").endswith(("m/s2", "above"))
    for name in one.reachable:
        assert one.limit("vertical", name) in one.bounds["vertical"]
    assert {*one.notes} <= {"vertical", "lateral", "longitudinal"}
