"""Units: every trade unit by number, every refusal by its one line."""

import math
import subprocess
import sys
import time

import pytest
from hypothesis import given
from hypothesis import strategies as st

from ductsolve.app import units
from ductsolve.app.unit_grammar import ATOMS, COMPOUNDS
from ductsolve.errors import CaseError

# Exact by definition: inch 25.4 mm, pound 0.45359237 kg, US gallon 231 in3, standard gravity 9.80665 m/s2
# (NIST Special Publication 811, appendix B).
INCH, FOOT, POUND, GALLON = 0.0254, 0.3048, 0.45359237, 231 * 0.0254**3
POUND_FORCE = POUND * 9.80665

# Rounded values in the comments are those of NIST Special Publication 811, appendix B, where it lists them.
UNITS = [
    ("length", "m", 1.0),
    ("length", "cm", 0.01),
    ("length", "mm", 1e-3),
    ("length", "um", 1e-6),
    ("length", "µm", 1e-6),
    ("length", "μm", 1e-6),  # Greek mu, where the line above has the micro sign
    ("length", "in", INCH),
    ("length", "ft", FOOT),
    ("length", "mil", INCH / 1000),
    ("time", "ms", 1e-3),
    ("time", "min", 60.0),
    ("time", "h", 3600.0),
    ("velocity", "ft/min", FOOT / 60),
    ("velocity", "m/s", 1.0),
    ("density", "kg/m^3", 1.0),
    ("density", "kg/m3", 1.0),
    ("density", "kg/m³", 1.0),
    ("density", "g/cm3", 1000.0),
    ("density", "ppg", POUND / GALLON),  # 119.8264
    ("density", "lb/gal", POUND / GALLON),
    ("density", "lbm/ft3", POUND / FOOT**3),  # 16.01846
    ("pressure", "bar", 1e5),
    ("pressure", "kPa", 1e3),
    ("pressure", "MPa", 1e6),
    ("pressure", "psi", POUND_FORCE / INCH**2),  # 6894.757
    ("stress", "Pa", 1.0),
    ("stress", "mPa", 1e-3),
    ("stress", "dyn/cm2", 0.1),
    ("stress", "lbf/100ft2", POUND_FORCE / FOOT**2 / 100),  # lbf/ft2: 47.88026
    ("stress", "lbf/100ft^2", POUND_FORCE / FOOT**2 / 100),
    ("stress", "lbf/100ft**2", POUND_FORCE / FOOT**2 / 100),
    ("stress", "lbf/100 ft2", POUND_FORCE / FOOT**2 / 100),
    ("stress", "lbf / (100 ft²)", POUND_FORCE / FOOT**2 / 100),
    ("stress", "lb/100ft2", POUND_FORCE / FOOT**2 / 100),
    ("stress", "N/m2", 1.0),
    ("viscosity", "Pa.s", 1.0),
    ("viscosity", "Pa s", 1.0),
    ("viscosity", "Pa*s", 1.0),
    ("viscosity", "Pa·s", 1.0),
    ("viscosity", "Pa-s", 1.0),
    ("viscosity", "mPa.s", 1e-3),
    ("viscosity", "cP", 1e-3),
    ("viscosity", "P", 0.1),
    ("viscosity", "kg/m/s", 1.0),
    ("viscosity", "kg/(m.s)", 1.0),
    ("viscosity", "kg m^-1 s^-1", 1.0),
    ("viscosity", "lbf.s/ft2", POUND_FORCE / FOOT**2),  # 47.88026
    ("shear rate", "1/s", 1.0),
    ("shear rate", "/s", 1.0),
    ("shear rate", "s^-1", 1.0),
    ("shear rate", "s-1", 1.0),
    ("shear rate", "s⁻¹", 1.0),
    ("shear rate", "1/min", 1 / 60),
    ("pressure gradient", "Pa/m", 1.0),
    ("pressure gradient", "bar/m", 1e5),
    ("pressure gradient", "psi/ft", POUND_FORCE / INCH**2 / FOOT),
    ("pressure gradient", "psi/1000ft", POUND_FORCE / INCH**2 / FOOT / 1000),
    ("volume flow", "m3/h", 1 / 3600),
    ("volume flow", "L/min", 1e-3 / 60),
    ("volume flow", "l/s", 1e-3),
    ("volume flow", "mL/min", 1e-6 / 60),
    ("volume flow", "cm3/s", 1e-6),
    ("volume flow", "gpm", GALLON / 60),  # 6.309020e-5
    ("volume flow", "gal/min", GALLON / 60),
    ("volume flow", "bbl/min", 42 * GALLON / 60),  # barrel of 42 gallons: 0.1589873 m3
    ("mass flow", "kg/h", 1 / 3600),
    ("mass flow", "t/h", 1000 / 3600),
    ("mass flow", "lb/h", POUND / 3600),
]


@pytest.mark.parametrize(("kind", "unit", "size"), UNITS)
def test_size_of_unit(kind, unit, size):
    assert units.parse(f"1 {unit}", kind, where="w") == pytest.approx(size, rel=1e-14)
    assert units.parse(f"2.5 {unit}", kind, where="w") == pytest.approx(2.5 * size, rel=1e-14)
    assert units.unit_of(f"2.5 {unit}") == unit
    assert units.measures(unit, kind)


# Values of the trade, common practice, no source; they check the table above from outside it.
@pytest.mark.parametrize(
    ("text", "kind", "value"),
    [
        ("1 lbf/100ft2", "stress", 0.478802590),
        ("1 ppg", "density", 119.826427),
        ("1 gpm", "volume flow", 6.30901964e-5),
        ("1 bbl/min", "volume flow", 2.64978825e-3),
        ("1 psi/ft", "pressure gradient", 22620.6),
    ],
)
def test_trade_values(text, kind, value):
    assert units.parse(text, kind, where="w") == pytest.approx(value, rel=1e-6)


def test_every_unit_can_be_worked_out():
    for name in [*ATOMS, *COMPOUNDS]:
        assert any(units.measures(f"{name}{rest}", kind) for kind in units.KINDS for rest in UNIT_RESTS), name


UNIT_RESTS = ["", ".s", "/s", "/m3", "/m2"]  # what makes each named unit one of a kind in the table


def test_examples_and_si_units_of_the_kinds_are_of_the_kind():
    for kind, record in units.KINDS.items():
        assert units.scale(record.unit, kind) == 1.0
        assert units.parse(record.example, kind, where="w") > 0


@pytest.mark.parametrize("text", ["1e-3 m", "1E-3 m", ".001 m", "+0.001 m", "1.e-3 m", " 1e-3m "])
def test_ways_to_write_a_number(text):
    assert units.parse(text, "length", where="w") == 1e-3


def test_numbers_are_rounded_once():
    assert units.parse("8.5 in", "length", where="w") == 0.2159
    assert units.parse("1 ft", "length", where="w") == 0.3048


@given(
    value=st.floats(1e-9, 1e9),
    choice=st.sampled_from([(kind, unit) for kind, unit, _ in UNITS]),
)
def test_scale_and_parse_are_inverse(value, choice):
    kind, unit = choice
    shown = value / units.scale(unit, kind)
    assert units.parse(f"{shown!r} {unit}", kind, where="w") == pytest.approx(value, rel=1e-14)


REFUSED = [
    (20, "length", "20 is missing its unit"),
    (2.5, "length", "2.5 is missing its unit"),
    ("20", "length", "'20' is missing its unit"),
    (True, "length", "found true"),
    (math.nan, "length", "nan is not a finite number"),
    (-math.inf, "length", "-inf is not a finite number"),
    (10**400, "length", "inf is not a finite number"),
    ([1], "length", "found a list"),
    ({}, "length", "found a table"),
    ("", "length", "does not start with a number"),
    ("mm", "length", "does not start with a number"),
    ("nan m", "length", "does not start with a number"),
    ("inf m", "length", "does not start with a number"),
    ("__import__('os')", "length", "does not start with a number"),
    ("\x00 m", "length", "does not start with a number"),
    ("٣ mm", "length", "does not start with a number"),
    ("-3 mm", "length", "negative"),
    ("1,5 mm", "length", "comma"),
    ("1.000,5 mm", "length", "comma"),
    ("1e999 m", "length", "out of range"),
    ("1e999999999999 m", "length", "out of range"),
    ("1e50 m", "length", "out of range"),
    ("1e-50 m", "length", "out of range"),
    ("9**9**9 m", "length", "cannot read the unit"),
    ("1 m^99", "length", "cannot read the unit"),
    ("1 m^0", "length", "cannot read the unit"),
    ("1 0ft", "length", "cannot read the unit"),
    ("1 m/0ft", "length", "cannot read the unit"),
    ("1 100ft", "length", "cannot read the unit"),
    ("1 000 m", "length", "cannot read the unit"),
    ("1 ((m", "length", "cannot read the unit"),
    ("1 kg/(m/s)", "viscosity", "cannot read the unit"),
    ("1 kg/", "mass flow", "cannot read the unit"),
    ("1 m^n", "length", "no whole number"),
    ("1 m.\x1b[2Js", "length", "cannot read the unit"),
    ("1 " + "m" * 100, "length", "too long"),
    ("1 kg/m.s", "viscosity", "two readings"),
    ("1 kg/m s", "viscosity", "two readings"),
    ("1 mpa.s", "viscosity", "did you mean mPa or MPa?"),
    ("1 Kg/h", "mass flow", "did you mean kg?"),
    ("1 GPM", "volume flow", "did you mean gpm?"),
    ("1 gallon/min", "volume flow", "did you mean gal?"),
    ("1 furlong", "length", "unknown unit 'furlong'"),
    ("20 s", "length", "'s' is not a unit of length but of time"),
    ("20 m3/h", "mass flow", "is not a unit of mass flow but of volume flow"),
    ("1 lb/100ft2", "pressure", "is not a unit of pressure"),
    ("1 m^5", "length", "'m^5' is not a unit of length;"),
]


@pytest.mark.parametrize(("text", "kind", "message"), REFUSED)
def test_refusals_are_one_line_that_says_what_would_do(text, kind, message):
    started = time.perf_counter()
    with pytest.raises(CaseError) as caught:
        units.parse(text, kind, where="case.toml: [section] width")
    line = str(caught.value)
    assert time.perf_counter() - started < 1.0
    assert line.startswith("case.toml: [section] width: ")
    assert message in line
    assert line.isprintable() and len(line) < 300


@given(st.text(max_size=80))
def test_no_text_does_anything_but_parse_or_be_refused(text):
    for reading in (f"1 {text}", text):
        try:
            assert math.isfinite(units.parse(reading, "length", where="w"))
        except CaseError as error:
            assert "\n" not in str(error)


@given(st.text(alphabet="kgmsPa/.()^*-123n ", max_size=60))
def test_unit_like_text_is_judged_quickly(text):
    started = time.perf_counter()
    units.measures(text, "viscosity")
    assert time.perf_counter() - started < 0.5


# --- consistency -------------------------------------------------------------------------------------

POUND_PER_100 = POUND_FORCE / FOOT**2 / 100


@pytest.mark.parametrize(
    ("text", "index", "value"),
    [
        ("0.6 Pa.s^n", 0.45, 0.6),
        ("0.6 Pa.s^0.45", 0.45, 0.6),
        ("0.6 Pa.s^.45", 0.45, 0.6),
        ("0.6 Pa s^n", 0.45, 0.6),
        ("0.6 Pa·sⁿ", 0.45, 0.6),
        ("600 mPa.s^n", 0.45, 0.6),
        ("1 lbf.s^n/100ft2", 0.7, POUND_PER_100),
        ("1 lb-s^n/100ft^2", 0.7, POUND_PER_100),
        ("1 lbf.s^n/100ft2", 1, POUND_PER_100),
        ("6 dyn.s^n/cm2", 0.5, 0.6),
        ("100 eq. cP", 0.7, 0.1),
        ("100 eq cP", 0.7, 0.1),
        ("100 eq.cP", 1.0, 0.1),
        ("0.6 Pa.s", 1.0, 0.6),
        ("0.6 Pa.s^1.0", 1.0, 0.6),
        ("0.6 Pa.s^n", 1, 0.6),
        ("60 cP", 1, 0.06),
        ("0.6 kg/m/s", 1, 0.6),
        ("0.6 Pa.s^2", 2, 0.6),
        ("0.6 Pa.s^1.2", 1.2, 0.6),
    ],
)
def test_consistency(text, index, value):
    assert units.parse_consistency(text, index, where="w") == pytest.approx(value, rel=1e-14)


def test_equivalent_centipoise_in_a_field_consistency():
    # 478.8 eq. cP to the lbf s^n/100ft2: common practice in drilling, no source.
    field = units.parse_consistency("1 lbf.s^n/100ft2", 0.6, where="w")
    assert units.parse_consistency("478.8 eq. cP", 0.6, where="w") == pytest.approx(field, rel=1e-4)


@pytest.mark.parametrize(
    ("text", "index", "message"),
    [
        ("0.6 Pa.s^0.5", 0.45, "s to the power 0.5 but the index is 0.45"),
        ("0.6 Pa.s", 0.45, "s to the power 1 but the index is 0.45"),
        ("60 cP", 0.45, "is not a unit of consistency"),
        ("60 cP.s^n", 0.45, "is not a unit of consistency"),
        ("0.6 Pa/s^n", 0.45, "is not a unit of consistency"),
        ("0.6 Pa.s^n.s^n", 0.45, "is not a unit of consistency"),
        ("0.6 m.s^n", 0.45, "is not a unit of consistency"),
        ("0.6 Pa.m^n", 0.45, "no whole number"),
        ("0.6", 0.45, "missing its unit"),
        (0.6, 0.45, 'missing its unit: write e.g. "0.6 Pa.s^n"'),
    ],
)
def test_consistency_refused(text, index, message):
    with pytest.raises(CaseError, match=r"^c: ") as caught:
        units.parse_consistency(text, index, where="c")
    assert message in str(caught.value)


# --- shares, showing, loading ------------------------------------------------------------------------


@pytest.mark.parametrize(("text", "value"), [("1 %", 0.01), ("0.5%", 0.005), (0.02, 0.02)])
def test_share(text, value):
    assert units.parse_share(text, where="w") == value


@pytest.mark.parametrize("text", [1, 0, True, math.nan, 2.5, "0.01", "1 m", "100 %", "-1 %", "0 %", [], "x"])
def test_share_refused(text):
    with pytest.raises(CaseError, match=r'^w: .*"1 %"|^w: .*negative'):
        units.parse_share(text, where="w")


@pytest.mark.parametrize(
    ("value", "unit", "chosen"),
    [
        (0.0123, "m", "mm"),
        (1.25, "m", "m"),
        (0.0, "m", "mm"),
        (-2500.0, "Pa", "kPa"),
        (123456.0, "Pa/m", "kPa/m"),
        (1e-9, "m^3/s", "mL/min"),
        (0.005, "m^3/s", "L/min"),
        (0.5, "m^3/s", "m^3/h"),
    ],
)
def test_suiting_unit(value, unit, chosen):
    assert units.suiting(value, unit) == chosen


def test_scale_names_the_place_of_an_unknown_unit():
    with pytest.raises(CaseError, match=r"^\[report\] length: unknown unit 'inn'; did you mean in"):
        units.scale("inn", "length", where="[report] length")
    with pytest.raises(CaseError, match="'gpm' is not a unit of length but of volume flow"):
        units.scale("gpm", "length")


def test_pint_is_loaded_only_when_a_unit_is_read():
    code = "import sys, ductsolve.app.units; print(sorted({'pint', 'numpy'} & set(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
