"""Fuel power from an amount of fuel and its dated heating values."""

from __future__ import annotations

from typing import TYPE_CHECKING, Literal

import numpy as np
from numpy.typing import NDArray

from auditor.metering.metered import Metered
from auditor.physics import fuel_exergy_W
from auditor.physics.arrays import FloatArray

if TYPE_CHECKING:
    from auditor.metering.inputs import Reader
    from auditor.records.plant import Fuel, HeatingValue

Basis = Literal["lower", "higher"]


def fuel_power(read: Reader, fuel: Fuel, amount_per_s: FloatArray) -> Metered:
    """Power of a fuel on the machine's basis, on both bases, and its exergy.

    ``P = amount x H(t) x f``: each tick takes the heating value that is valid at its start; ``f`` is
    one common factor, 1 within the fuel's declared uncertainty, so that both bases and every machine
    that burns the fuel move together.

    Parameters
    ----------
    read : Reader
        Of the fuel stream.
    fuel : Fuel
        With its heating values per m3 at its volume state, or per kg.
    amount_per_s : ndarray, shape (T,) [m3/s] or [kg/s]
        Flow of the fuel.

    Returns
    -------
    Metered
        NaN before the first heating value. ``lower_W`` and ``higher_W`` are there when every
        heating value valid in the period states them.

    Raises
    ------
    ValueError
        If the machine has no basis, or the heating values do not state it.
    """
    factor = read.number(fuel.value_standard)
    powers: dict[Basis, FloatArray | None] = {}
    bases: tuple[Basis, ...] = ("lower", "higher")
    for basis in bases:
        value = dated_heating_value(fuel.values, basis, read.start_us)
        powers[basis] = None if value is None else amount_per_s * value * factor
    power = on_basis(powers["lower"], powers["higher"], read.machine.basis)
    if power is None:
        raise ValueError(f"{read.stream.key}: {fuel.name} states no {read.machine.basis} heating value")
    exergy = None
    of_basis = None if fuel.exergy_of is None else powers[fuel.exergy_of]
    if fuel.exergy is not None and of_basis is not None:
        exergy = fuel_exergy_W(of_basis, read.number(fuel.exergy))
    return Metered(power, lower_W=powers["lower"], higher_W=powers["higher"], exergy_W=exergy)


def on_basis(
    lower_W: FloatArray | None, higher_W: FloatArray | None, basis: Basis | None
) -> FloatArray | None:
    """Return the one of two fuel powers that a machine's declared basis asks for."""
    return {"lower": lower_W, "higher": higher_W, None: None}[basis]


def valid_entry(values: tuple[HeatingValue, ...], start_us: NDArray[np.int64]) -> NDArray[np.intp]:
    """Index of the heating value valid at the start of each tick, shape (T,); -1 before the first."""
    from_us = np.array([value.from_us for value in values], dtype=np.int64)
    return np.searchsorted(from_us, start_us, side="right") - 1


def dated_heating_value(
    values: tuple[HeatingValue, ...], basis: Basis, start_us: NDArray[np.int64]
) -> FloatArray | None:
    """Heating value of each tick.

    Parameters
    ----------
    values : tuple of HeatingValue
        In order of time.
    basis : "lower" or "higher"
        Which of the two.
    start_us : ndarray of int64, shape (T,)
        Start of each tick.

    Returns
    -------
    ndarray, shape (T,) [J/m3] or [J/kg], or None
        NaN before the first entry; None when an entry valid in the period does not state it.
    """
    entry = valid_entry(values, start_us)
    stated = [value.lower if basis == "lower" else value.higher for value in values]
    # The declared uncertainty is the common factor's alone; it would count twice if it were read here.
    numbers = np.array([np.nan if assumed is None else assumed.value for assumed in stated])
    used = np.unique(entry[entry >= 0])
    if np.isnan(numbers[used]).any():
        return None
    return np.where(entry >= 0, numbers[entry], np.nan)
