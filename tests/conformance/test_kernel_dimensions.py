"""Every law, called with quantities instead of numbers, gives the dimension that it claims.

A forgotten square, a factor too many or a sum of unlike things does not survive this.
"""

import numpy as np
import pytest

from strikeenergy.note import Formula
from strikeenergy.physics import adiabatic, arcroot, channel, magnetics
from strikeenergy.units import registry

UNITS = {
    "gamma": "kg/m**3", "c": "J/(kg*K)", "C": "J/(m**3*K)", "rho_r": "ohm*m", "alpha_r": "1/K", "T": "K", "T_r": "K",
    "w": "J/ohm", "W_on": "J/ohm", "W_full": "J/ohm", "alpha": "1/K", "rho0": "ohm*m", "q": "m**2", "rise": "K",
    "s": "A**2*s/m**4", "L": "J/kg", "rho_m": "ohm*m", "l": "m", "f": "", "u": "V", "Q": "C", "T_m": "K", "T_0": "K",
    "d": "m", "i2": "A**2", "x": "m", "x1": "m", "x2": "m", "r": "m", "mu0": "H/m",
    "H": "m", "eps": "m", "D": "", "e": "J/m", "V": "V", "E": "J", "E_f": "J",
}  # fmt: skip
RESULTS = {
    "adiabatic.HEAT_PER_VOLUME": "J/(m**3*K)",
    "adiabatic.RESISTIVITY_AT": "ohm*m",
    "adiabatic.COEFFICIENT_AT": "1/K",
    "adiabatic.RISE": "K",
    "adiabatic.RISE_CONSTANT": "K",
    "adiabatic.ACTION_TO": "A**2*s/m**4",
    "adiabatic.ACTION_TO_CONSTANT": "A**2*s/m**4",
    "adiabatic.ENERGY_ONSET": "J/ohm",
    "adiabatic.ENERGY_FULL": "J/ohm",
    "adiabatic.MELTED_FRACTION": "",
    "adiabatic.SECTION_FOR": "m**2",
    "adiabatic.RESISTANCE": "ohm",
    "adiabatic.HEAT_STORED": "J",
    "adiabatic.HEAT_STORED_SOLID": "J",
    "magnetics.PARALLEL_PER_LENGTH": "N/m",
    "magnetics.PARALLEL_FINITE": "N",
    "magnetics.BEND_PER_LENGTH": "N/m",
    "magnetics.BEND": "N",
    "magnetics.BEND_CUTOFF_UNIFORM": "m",
    "magnetics.PINCH_SURFACE": "Pa",
    "magnetics.PINCH_AXIS": "Pa",
    "arcroot.MELTED_VOLUME_BOUND": "m**3",
    "arcroot.ROOT_ENERGY": "J",
    "arcroot.SPREAD_MELT_RADIUS": "m",
    "channel.LENGTH": "m",
    "channel.ENERGY": "J",
    "channel.ENERGY_FALLEN": "J",
    "channel.ENERGY_DISCHARGED": "J",
    "channel.SHARE": "",
}
LAWS = {
    f"{module.__name__.rsplit('.', 1)[-1]}.{name}": law
    for module in (adiabatic, magnetics, arcroot, channel)
    for name, law in vars(module).items()
    if isinstance(law, Formula)
}


def test_every_law_is_held_against_its_dimension():
    assert set(LAWS) == set(RESULTS)


@pytest.mark.parametrize("name", sorted(RESULTS))
def test_dimension(name):
    law, ureg = LAWS[name], registry()
    numbers = {n: 2.0 + 0.1 * k for k, n in enumerate((*law.names, "mu0"))}
    if "T_m" in numbers:
        numbers["T_m"] += 5
    quantities = {n: ureg.Quantity(v, UNITS[n] or "dimensionless") for n, v in numbers.items()}
    result = law(**quantities).to(RESULTS[name] or "dimensionless")
    # The number is that of the plain call: units at the door change nothing inside.
    assert result.magnitude == pytest.approx(float(law(**numbers)), rel=1e-12)


def test_a_forgotten_square_is_caught():
    import pint

    wrong = Formula("expm1(w*alpha*rho0/(q*C))/alpha")
    with pytest.raises(pint.DimensionalityError):
        wrong(**{n: registry().Quantity(1.0, UNITS[n]) for n in wrong.names})


def test_laws_broadcast():
    w = np.array([1e6, 1e7])
    both = adiabatic.RISE(w=w, alpha=3.92e-3, rho0=17.8e-9, q=16e-6, C=8920 * 385)
    one = [adiabatic.RISE(w=v, alpha=3.92e-3, rho0=17.8e-9, q=16e-6, C=8920 * 385) for v in w]
    np.testing.assert_array_equal(both, one)
