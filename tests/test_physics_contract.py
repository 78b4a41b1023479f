"""What every public physics function promises: names, docstrings, missing values, a cheap import."""

from __future__ import annotations

import inspect
import re
import subprocess
import sys

import numpy as np
import pytest

from auditor import physics

UNITS = {
    "W_per_K": "W/K",
    "J_per_kgK": "J/(kg K)",
    "J_per_kg": "J/kg",
    "kg_per_m3": "kg/m3",
    "kg_per_s": "kg/s",
    "m3_per_s": "m3/s",
    "m3_per_m3": "m3/m3",
    "per_K": "1/K",
    "per_s": "1/s",
    "Nm": "N m",
    "Pa": "Pa",
    "W": "W",
    "K": "K",
    "m": "m",
}
PUBLIC = [getattr(physics, name) for name in physics.__all__]
FUNCTIONS = [item for item in PUBLIC if inspect.isfunction(item)]
ELEMENTWISE = [
    f for f in FUNCTIONS if "shape (k" not in inspect.getdoc(f) and "(n, k)" not in inspect.getdoc(f)
]


def unit_in(name: str) -> str | None:
    """Return the unit that a name ends in."""
    for suffix, unit in UNITS.items():
        if name.endswith(f"_{suffix}"):
            return unit
    return None


@pytest.mark.parametrize("function", FUNCTIONS, ids=lambda f: f.__name__)
def test_the_unit_in_a_name_is_the_unit_in_its_docstring(function: object) -> None:
    """A function's name and its Returns section agree, and so does every argument."""
    doc = inspect.getdoc(function)
    assert doc is not None
    returns = doc.split("Returns\n-------\n")[1].split("\n")[0]
    parameters = doc.split("Parameters\n----------\n")[1].split("Returns\n-------")[0]
    unit = unit_in(function.__name__)
    if unit:
        assert f"[{unit}]" in returns
    for name in inspect.signature(function).parameters:
        line = next(row for row in parameters.split("\n") if re.match(rf"(\w+, )*{name}\b", row))
        unit = unit_in(name)
        if unit:
            assert f"[{unit}]" in line, f"{name}: {line}"


@pytest.mark.parametrize("function", FUNCTIONS, ids=lambda f: f.__name__)
def test_every_function_has_an_example(function: object) -> None:
    """Each docstring has an example, which the tests run."""
    assert ">>> " in (inspect.getdoc(function) or "")


def plausible(name: str) -> object:
    """Return a believable argument for a parameter by its name."""
    numbers = {
        "pressure_Pa": 1e6, "absolute_pressure_Pa": 1e6, "reference_pressure_Pa": 1e5,
        "gauge_Pa": 1e4, "atmosphere_Pa": 1e5, "oxygen_dry": 0.05, "altitude_m": 100.0,
        "expansion_per_K": 1e-3, "limit": 1.0, "count": 5.0, "autocorrelation": 0.2,
    }  # fmt: skip
    if name.endswith("_carrier") or name == "carrier":
        return physics.WaterHeatCarrier()
    hot = ("hot", "source", "inlet", "flue_gas")
    return numbers.get(name, (350.0 if name.startswith(hot) else 300.0) if name.endswith("_K") else 1.0)


@pytest.mark.parametrize("function", ELEMENTWISE, ids=lambda f: f.__name__)
def test_missing_stays_in_its_place(function: object) -> None:
    """NaN in one element of any argument makes that element NaN (a mask: False), and no other."""
    if function is physics.glycol_water:
        pytest.skip("builds a fluid from two words, not from readings")
    names = list(inspect.signature(function).parameters)
    believable = {name: plausible(name) for name in names}
    scalar = function(**believable)
    assert np.ndim(scalar) == 0
    for name in names:
        if isinstance(believable[name], float):
            value = believable[name]
            result = function(**believable | {name: np.array([value, np.nan, value])})
            expected = [scalar, False if np.asarray(scalar).dtype == bool else np.nan, scalar]
            np.testing.assert_array_equal(result, expected, err_msg=name)


@pytest.mark.parametrize("function", ELEMENTWISE, ids=lambda f: f.__name__)
def test_celsius_for_kelvin_is_a_slip_of_the_program(function: object) -> None:
    """Every kelvin argument refuses zero and below with a message that names the function's slip."""
    names = list(inspect.signature(function).parameters)
    for name in (n for n in names if n.endswith("_K") and unit_in(n) == "K"):
        believable = {other: plausible(other) for other in names}
        with pytest.raises(ValueError, match=r"kelvin above zero, got -5; was a Celsius"):
            function(**believable | {name: np.array([300.0, np.nan, -5.0])})


def test_the_public_list_is_right_and_in_order() -> None:
    """Everything that is listed exists, nothing twice, in alphabetical order."""
    assert physics.__all__ == sorted(set(physics.__all__))
    assert all(item.__doc__ for item in PUBLIC)


def test_importing_physics_and_units_loads_nothing_heavy() -> None:
    """The heavy libraries stay out until a conversion or a glycol asks for them."""
    code = (
        "import sys, auditor.physics, auditor.units\n"
        "heavy = {'pint', 'scipy', 'CoolProp', 'pandas', 'pyarrow', 'plotly', 'pydantic'}\n"
        "print(sorted(heavy & set(sys.modules)))\n"
        "print(auditor.units.conversion('kW').scale, 'pint' in sys.modules)"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)

    assert run.stdout.split("\n")[:2] == ["[]", "1000.0 True"]
