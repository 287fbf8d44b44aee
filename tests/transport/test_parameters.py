"""The one table of limits: complete, consistent, and put in words."""

from __future__ import annotations

import math

import msgspec
import pytest

from transport import document
from transport.parameters import PARAMETERS, Parameter, default

RECORDS = [document.Conditions, document.LeadRecord, document.LayerRecord, document.StackRecord, document.WindowRecord,
           document.TargetRecord, document.UserMaterial, document.EndsRecord, document.EndCellRecord,
           document.GrowthRecord, document.MeasuredRecord, document.PeakRecord]


@pytest.mark.parametrize("record", RECORDS)
def test_every_number_of_a_scenario_has_a_limit(record: type[document.Record]) -> None:
    for field in msgspec.structs.fields(record):
        if field.type in (int, float, int | None, float | None):
            assert field.name in PARAMETERS


@pytest.mark.parametrize("parameter", PARAMETERS.values(), ids=PARAMETERS)
def test_a_default_is_within_its_limits_and_everything_is_explained(parameter: Parameter) -> None:
    assert parameter.low < parameter.high
    assert parameter.default is None or parameter.admits(parameter.default)
    assert parameter.help


@pytest.mark.parametrize(("name", "low", "high"), [
    ("file_layers", 1, 2000), ("periods", 1, 1_000_000), ("thickness_nm", 0, 10_000), ("monolayers", 0, 20_000),
    ("temperature_K", 0, 2000), ("mass", 1e-4, 1000), ("energy_eV", -1000, 1000), ("band_edge_eV", -1000, 1000),
    ("from_meV", -1e6, 1e6), ("file_bytes", 1, 1_000_000), ("most_periods", 1, 2000),
])
def test_the_limits_are_the_agreed_ones(name: str, low: float, high: float) -> None:
    assert (PARAMETERS[name].low, PARAMETERS[name].high) == (low, high)


def test_bounds_count_unless_they_are_open() -> None:
    assert PARAMETERS["mass"].admits(1e-4)
    assert PARAMETERS["x"].admits(0.0)
    assert not PARAMETERS["thickness_nm"].admits(0.0)
    assert PARAMETERS["thickness_nm"].admits(10_000.0)
    assert not PARAMETERS["thickness_nm"].admits(math.nextafter(10_000.0, math.inf))
    assert not Parameter("share", None, 0.0, 1.0, "", "", high_open=True).admits(1.0)


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
def test_no_limit_admits_what_is_not_finite(value: float) -> None:
    assert not any(parameter.admits(value) for parameter in PARAMETERS.values())


@pytest.mark.parametrize(("name", "words"), [
    ("thickness_nm", "must be above 0 and at most 10,000 nm"),
    ("x", "must be from 0 to 1"),
    ("periods", "must be a whole number from 1 to 1,000,000"),
    ("mass", "must be from 0.0001 to 1,000 m0"),
    ("donors_cm3", "must be above 0 and at most 1e+22 per cm3"),
])
def test_a_limit_reads_as_a_requirement(name: str, words: str) -> None:
    assert PARAMETERS[name].requirement == words


def test_an_open_upper_bound_says_below() -> None:
    assert Parameter("share", None, 0.0, 1.0, "", "", high_open=True).requirement == "must be at least 0 and below 1"


def test_a_default_that_does_not_exist_is_not_made_up() -> None:
    assert default("temperature_K") == 300
    with pytest.raises(ValueError, match=r"^name is 'mass': that parameter has no default$"):
        default("mass")
