"""Parameters: what is refused and how, what they are called, and the Newtonian limit of every law."""

import dataclasses

import numpy as np
import pytest
from rheology_cases import CASES, DECADES, name

from ductsolve.errors import FluidError
from ductsolve.rheology import laws
from ductsolve.rheology.laws import (
    Bingham,
    CarreauYasuda,
    Casson,
    Cross,
    Ellis,
    HerschelBulkley,
    Newtonian,
    PowerLaw,
    RobertsonStiff,
    Sisko,
)
from ductsolve.rheology.tabulated import FlowCurve

NEWTONIAN_LIMITS = [
    Newtonian(0.7),
    PowerLaw(0.7, 1.0),
    Bingham(0.0, 0.7),
    HerschelBulkley(0.0, 0.7, 1.0),
    Casson(0.0, 0.7),
    CarreauYasuda(0.7, 0.0, 3.0, 1.0),
    CarreauYasuda(0.7, 0.7, 3.0, 0.2, 0.5),
    CarreauYasuda(0.7, 0.0, 1e-40, 0.4),
    Cross(0.7, 0.7, 3.0, 0.8),
    Cross(0.7, 0.0, 1e-40, 0.8),
    Ellis(0.7, 1e40, 2.5),
    Ellis(1.4, 1.0, 1.0),
    Sisko(0.7, 0.0, 0.4),
    Sisko(0.3, 0.4, 1.0),
    Sisko(0.0, 0.7, 1.0),
    RobertsonStiff(0.7, 1.0, 0.0),
    FlowCurve([1.0, 7.0, 100.0], [0.7, 4.9, 70.0]),
]


@pytest.mark.parametrize("fluid", NEWTONIAN_LIMITS, ids=lambda fluid: str(fluid).replace("_", " "))
def test_newtonian_limit(fluid):
    """Common practice, no source: every law holds the Newtonian fluid as a special case."""
    stress = 0.7 * DECADES
    close = dict(rtol=1e-12)
    np.testing.assert_allclose(fluid.stress(DECADES), stress, **close)
    np.testing.assert_allclose(fluid.rate(stress), DECADES, **close)
    np.testing.assert_allclose(fluid.potential(DECADES), stress * DECADES / 2.0, **close)
    np.testing.assert_allclose(fluid.complementary(stress), stress * DECADES / 2.0, **close)
    np.testing.assert_allclose(fluid.rate_slope(stress), 1.0 / 0.7, **close)
    np.testing.assert_allclose(fluid.local_exponent(DECADES), 1.0, **close)
    assert fluid.yield_stress == 0.0
    assert fluid.rate_slope(0.0) == pytest.approx(1.0 / 0.7, rel=1e-12)


GOOD = {
    Newtonian: dict(viscosity=1.0),
    PowerLaw: dict(consistency=1.0, index=0.5),
    Bingham: dict(yield_stress=1.0, plastic_viscosity=1.0),
    HerschelBulkley: dict(yield_stress=1.0, consistency=1.0, index=0.5),
    Casson: dict(yield_stress=1.0, plastic_viscosity=1.0),
    CarreauYasuda: dict(
        zero_shear_viscosity=1.0, infinite_shear_viscosity=0.1, time_constant=1.0, index=0.5, transition=2.0
    ),
    Cross: dict(zero_shear_viscosity=1.0, infinite_shear_viscosity=0.1, time_constant=1.0, exponent=0.8),
    Ellis: dict(zero_shear_viscosity=1.0, half_stress=1.0, exponent=2.0),
    Sisko: dict(infinite_shear_viscosity=1.0, consistency=1.0, index=0.5),
    RobertsonStiff: dict(consistency=1.0, index=0.5, rate_shift=1.0),
}
PARAMETERS = [(law, parameter) for law, values in GOOD.items() for parameter in values]


def test_constructors_keep_their_names_and_order():
    assert [law.__name__ for law in GOOD] == laws.__all__
    for law, values in GOOD.items():
        assert [field.name for field in dataclasses.fields(law)] == list(values)
        assert law(*values.values()).describe() == law(**values).describe()
    assert CarreauYasuda(1.0, 0.1, 1.0, 0.5).transition == 2.0


@pytest.mark.parametrize(
    "value", [float("nan"), float("inf"), -float("inf"), -1e-9, "3", True, None, 10**400, 1j]
)
@pytest.mark.parametrize(("law", "parameter"), PARAMETERS)
def test_every_parameter_must_be_a_number_that_fits(law, parameter, value):
    if parameter == "index" and law is CarreauYasuda and value == -1e-9:
        return  # a second plateau keeps this curve rising
    with pytest.raises(FluidError) as refusal:
        law(**(GOOD[law] | {parameter: value}))
    text = str(refusal.value)
    assert text.startswith(f"{law.law_name}: {parameter} is {repr(value)[:10]}") and "; give a " in text
    assert "\n" not in text and len(text) < 150


ZERO_IS_FINE = {"yield_stress", "infinite_shear_viscosity", "rate_shift"}


@pytest.mark.parametrize(("law", "parameter"), PARAMETERS)
def test_zero(law, parameter):
    arguments = GOOD[law] | {parameter: 0}
    carreau_index = law is CarreauYasuda and parameter == "index"
    if parameter in ZERO_IS_FINE or carreau_index or (law is Sisko and parameter == "consistency"):
        fluid = law(**arguments)
        assert getattr(fluid, parameter) == 0.0 and fluid.rate(fluid.stress(3.0)) == pytest.approx(3.0)
    else:
        with pytest.raises(FluidError, match=f"{parameter} is 0; give"):
            law(**arguments)


@pytest.mark.parametrize(
    ("make", "message"),
    [
        (lambda: PowerLaw(1.0, 0.005), "index is 0.005; give a finite number from 0.01 to 5"),
        (lambda: HerschelBulkley(1.0, 1.0, 6.0), "index is 6.0; give a finite number from 0.01 to 5"),
        (lambda: CarreauYasuda(1.0, 2.0, 1.0, 0.5), "infinite_shear_viscosity is 2 Pa.s, above"),
        (lambda: Cross(1.0, 2.0, 1.0, 0.5), "infinite_shear_viscosity is 2 Pa.s, above"),
        (lambda: CarreauYasuda(1.0, 0.0, 1.0, 0.0), "index is 0, which lets the stress level off"),
        (lambda: CarreauYasuda(1.0, 0.0, 1.0, -0.5), "index is -0.5, which lets the stress level off"),
        (lambda: CarreauYasuda(1.0, 1e-3, 1.0, -0.5), "or a larger infinite_shear_viscosity"),
        (lambda: CarreauYasuda(1.0, 0.1, 1.0, 0.5, 20.0), "transition is 20.0; give a finite number"),
        (lambda: Cross(1.0, 0.0, 1.0, 1.0), "exponent is 1, which lets the stress level off or fall"),
        (lambda: Cross(1.0, 0.01, 1.0, 1.3), "give 1.21 or less"),
        (lambda: Ellis(1.0, 1.0, 0.9), "exponent is 0.9; give a finite number from 1 to 100"),
        (lambda: Sisko(0.0, 0.0, 0.5), "infinite_shear_viscosity and consistency are both 0"),
    ],
)
def test_curves_that_would_fall_or_bend_the_wrong_way_are_refused(make, message):
    with pytest.raises(FluidError, match=message.replace("(", r"\(")):
        make()


@pytest.mark.parametrize("ratio", [1e-6, 1e-3, 0.1, 0.6])
def test_largest_cross_exponent_is_exact(ratio):
    """Up to (sqrt(zero) + sqrt(infinite)) / (sqrt(zero) - sqrt(infinite)) the stress rises, then it falls."""
    root = np.sqrt(ratio)
    largest = (1.0 + root) / (1.0 - root)
    rate = np.logspace(-10.0, 10.0, 20001)

    def least_step(m):
        stress = rate * (ratio + (1.0 - ratio) / (1.0 + rate**m))
        return np.diff(np.log(stress)).min()

    assert least_step(0.999 * largest) > 0.0 > least_step(1.001 * largest)
    assert Cross(1.0, ratio, 1.0, 0.989 * largest).rate(1.0) > 0.0
    with pytest.raises(FluidError, match="give"):
        Cross(1.0, ratio, 1.0, 0.991 * largest)


@pytest.mark.parametrize("case", CASES, ids=name)
def test_laws_are_frozen_and_described(case):
    for label, value, unit in case.fluid.describe():
        assert label == label.strip() and isinstance(value, float)
        assert unit in {"Pa", "Pa.s", "Pa.s^n", "s", "1/s", "-"}
    first = dataclasses.fields(case.fluid)[0].name
    with pytest.raises(dataclasses.FrozenInstanceError):
        setattr(case.fluid, first, 2.0)


def test_numbers_of_numpy_are_taken():
    fluid = PowerLaw(np.float32(2.0), np.int64(1))
    assert type(fluid.consistency) is float and fluid.index == 1.0


def test_description_reads_in_field_terms():
    assert HerschelBulkley(5.0, 2.0, 0.4).describe() == (
        ("yield stress", 5.0, "Pa"),
        ("consistency", 2.0, "Pa.s^n"),
        ("flow behaviour index", 0.4, "-"),
    )
