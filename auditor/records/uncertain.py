"""Declared uncertainties: of a tag's reading, and of a quantity that is assumed rather than logged."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Uncertainty:
    """One standard uncertainty, ``sqrt(absolute**2 + (relative * reading)**2)``.

    A class limit has been divided by the square root of three already (rectangular distribution).
    """

    absolute: float
    """In the SI unit of the value (kelvin for temperatures: a difference, not a level); per second for the
    calibration part of a counter or an amount, whose tick means are rates."""
    relative: float
    """Share of the reading [1]."""
    declared: str
    """The words of the plant file, e.g. ``limit 2 % of 1200 kW``, for the report."""


@dataclass(frozen=True)
class Assumed:
    """A number that nobody logs: a heating value, a share, a heat capacity, a compressibility."""

    key: str
    """Its place in the plant file, e.g. ``fuels.natural_gas.values``: also the name of its influence."""
    value: float
    """In SI."""
    standard: float
    """Absolute standard uncertainty, in the SI unit of ``value``."""
    unit: str
    """SI unit of ``value`` and ``standard``; ``1`` for a bare ratio."""
    declared: str
    """Value and uncertainty in the words of the plant file."""
    source: str = ""
    """Where the number was taken from, in the words of the plant file."""
