"""Numbers on paper: digits that the uncertainty carries, units that people read, words for time and size."""

from __future__ import annotations

import math

import pytest

from auditor.report import numbers
from auditor.report.clock import Clock, standard_offset
from auditor.units import DISPLAY

NBSP, THIN = numbers.NBSP, numbers.THIN
HOUR_US = 3_600_000_000


@pytest.mark.parametrize(
    ("value", "U", "printed"),
    [
        # Particle Data Group, Review of Particle Physics, introduction ("Rounding"), quoted from memory: the
        # three leading digits of the error decide; its own examples are 0.827 +- 0.119 -> 0.83 +- 0.12 and
        # 0.827 +- 0.367 -> 0.8 +- 0.4.
        (0.00827, 0.00119, ("0.83", "0.12")),
        (0.00827, 0.00367, ("0.8", "0.4")),
        (0.416237, 0.005, ("41.6", "0.5")),
        (0.416237, 0.0097, ("41.6", "1.0")),
        (0.2055, 0.0249, ("20.5", "2.5")),
    ],
)
def test_digits_follow_the_uncertainty(value: float, U: float, printed: tuple[str, str]) -> None:
    """No percentage has digits finer than its expanded uncertainty justifies."""
    shown = numbers.shown(value, U, DISPLAY["fraction"])
    assert (shown.value, shown.U) == printed


def test_energies_are_rounded_to_tens_and_grouped() -> None:
    """An uncertainty of 140 MWh leaves no single megawatt-hours in the value."""
    shown = numbers.figure("heat_in_J", 12_345.6 * 3.6e9, 140.0 * 3.6e9)
    assert shown.text == f"12{THIN}350{NBSP}±{NBSP}140{NBSP}MWh"


def test_temperatures_are_in_celsius_and_their_uncertainty_in_kelvin() -> None:
    """A level is shifted by 273.15, a difference is not."""
    shown = numbers.figure("source_temperature_K", 501.83, 0.55)
    assert shown.text == f"228.7{NBSP}°C ±{NBSP}0.6{NBSP}K"


def test_a_margin_is_a_difference_of_percentages() -> None:
    """Twenty-one percent below another percentage are points."""
    assert numbers.figure("margin", -0.2131, 0.004).text == f"\u221221.3{NBSP}±{NBSP}0.4{NBSP}points"


def test_a_figure_without_uncertainty_or_value_says_so() -> None:
    """Nothing is made up for what is not known."""
    assert numbers.figure("gross", math.nan, 0.01).text == numbers.UNKNOWN
    assert numbers.figure("gross", 0.20553, math.nan).text == f"20.6{NBSP}%"


def test_a_rounded_zero_has_no_sign() -> None:
    """A residual that rounds to nothing is not negative."""
    assert numbers.shown(-0.0001, 0.02, DISPLAY["fraction"]).value == "0.0"


@pytest.mark.parametrize(
    ("number", "said"),
    [(0, "no intervals"), (1, f"1{NBSP}interval"), (2976, f"2{THIN}976{NBSP}intervals")],
)
def test_singular_and_plural(number: int, said: str) -> None:
    """One interval, two intervals, no intervals."""
    assert numbers.count(number, "interval") == said


@pytest.mark.parametrize(
    ("joules", "said"),
    [(3.6e6, f"1.00{NBSP}kWh"), (3.6e10 * 0.999, f"9{THIN}990{NBSP}kWh"), (3.6e10, f"10.0{NBSP}MWh")],
)
def test_sizes_in_kilowatt_hours_until_they_are_large(joules: float, said: str) -> None:
    """From 10 000 kWh on a size is told in MWh."""
    assert numbers.energy(joules) == said


def test_local_times_name_the_offset_only_where_the_hour_repeats() -> None:
    """2025-10-26 02:30 happened twice in Copenhagen: before and after 01:00 UTC."""
    clock = Clock("Europe/Copenhagen")
    first = 1_761_438_600_000_000  # 2025-10-26 00:30 UTC
    assert clock.moment(first).endswith("02:30\u00a0(UTC+02:00)")
    assert clock.moment(first + HOUR_US).endswith("02:30\u00a0(UTC+01:00)")
    assert clock.moment(first + 2 * HOUR_US).endswith("03:30")


def test_pictures_use_standard_time_in_summer_too() -> None:
    """In July the clock in Stockholm is two hours ahead of UTC, its standard time one."""
    july = 1_782_856_800_000_000
    assert standard_offset("Europe/Stockholm", july) == (HOUR_US, "UTC+01:00")
    assert standard_offset("UTC", july) == (0, "UTC+00:00")
