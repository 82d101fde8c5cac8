"""Case files: what a good one gives, and the one line every bad one gets."""

import math
import re
import shutil
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from ductsolve.app.case import DEFAULT_ACCURACY, read_case
from ductsolve.errors import CaseError

GEOMETRIES = Path(__file__).parents[2] / "geometries"

SECTION = '[section]\nshape = "rectangle"\nwidth = "20 mm"\nheight = "10 mm"\n'
FLUID = '[fluid]\nlaw = "power law"\nconsistency = "0.6 Pa.s^n"\nindex = 0.45\n'
DUTY = '[duty]\npressure_gradient = "0.12 bar/m"\n'


def write(folder, section=SECTION, fluid=FLUID, duty=DUTY, top="", report=""):
    path = folder / "case.toml"
    path.write_text("\n".join([top, section, fluid, duty, report]), encoding="utf-8")
    return path


def refusal(path):
    """The one line a case is refused with, after the name of the file."""
    with pytest.raises(CaseError) as caught:
        read_case(path)
    line = str(caught.value)
    assert line.startswith(f"{path}: ")
    assert line.isprintable() and len(line) < len(str(path)) + 400
    return line.removeprefix(f"{path}: ")


# --- what a good case gives --------------------------------------------------------------------------


def test_case_in_si(tmp_path):
    case = read_case(write(tmp_path, top='title = "A duct"', report='[report]\nflow_rate = "gpm"'))
    assert case.title == "A duct"
    assert case.section.dimensions == {"width": 0.02, "height": 0.01}
    assert (case.fluid.consistency, case.fluid.index) == (0.6, 0.45)
    assert case.pressure_gradient == 12000.0
    assert case.flow_rate is None and case.density is None and case.length is None
    assert case.accuracy == DEFAULT_ACCURACY
    assert case.path == tmp_path / "case.toml"
    assert [tuple(item) for item in case.inputs] == [
        ("section shape", "rectangle", None, ""),
        ("section width", "20 mm", 0.02, "m"),
        ("section height", "10 mm", 0.01, "m"),
        ("fluid law", "power law", None, ""),
        ("fluid index", "0.45", 0.45, ""),
        ("fluid consistency", "0.6 Pa.s^n", 0.6, "Pa.s^0.45"),
        ("duty pressure gradient", "0.12 bar/m", 12000.0, "Pa/m"),
        ("duty accuracy", "1% (default)", 0.01, ""),
    ]
    units = {item.quantity: item for item in case.report}
    assert units["pressure_gradient"].unit == "bar/m"  # the duty's own
    assert units["pressure_gradient"].per_si == pytest.approx(1e-5)
    assert units["flow_rate"].per_si == pytest.approx(1 / 6.30901964e-5)


def test_title_is_the_file_name_if_not_given(tmp_path):
    assert read_case(str(write(tmp_path))).title == "case"


def test_byte_order_mark_and_windows_line_ends(tmp_path):
    path = write(tmp_path)
    path.write_bytes(b"\xef\xbb\xbf" + path.read_bytes().replace(b"\n", b"\r\n"))
    assert read_case(path).pressure_gradient == 12000.0


SHAPES = [
    ('shape = "Circle"\ndiameter = "1 in"', {"diameter": 0.0254}),
    ('shape = "ELLIPSE"\nwidth = "6 cm"\nheight = "3 cm"', {"width": 0.06, "height": 0.03}),
    ('shape = "annulus"\nouter_diameter = "60 mm"\ninner_diameter = "40 mm"', {"eccentricity": 0.0}),
    (
        'shape = "annulus"\nouter_diameter = "60 mm"\ninner_diameter = "40 mm"\neccentricity = 0.5',
        {"outer_diameter": 0.06, "inner_diameter": 0.04, "eccentricity": 0.5},
    ),
    (
        'shape = "annulus"\nouter_diameter = "60 mm"\ninner_diameter = "40 mm"\noffset = "2 mm"',
        {"eccentricity": pytest.approx(0.2)},
    ),
]


@pytest.mark.parametrize(("text", "dimensions"), SHAPES)
def test_shapes(tmp_path, text, dimensions):
    section = read_case(write(tmp_path, section=f"[section]\n{text}\n")).section
    assert dimensions.items() <= section.dimensions.items()


CURVE = (
    'law = "flow curve"\nshear_rate = { unit = "1/min", values = [60, 600, 6000] }\n'
    'shear_stress = { unit = "kPa", values = [0.001, 0.005, 0.02] }'
)
# law -> (text, shear rate [1/s], shear stress [Pa] worked out by hand from the law's equation)
LAWS = {
    "Newtonian": ('law = "newtonian"\nviscosity = "50 cP"', 10.0, 0.5),
    "power law": ('law = "Power_Law"\nconsistency = "2 Pa.s^n"\nindex = 0.5', 4.0, 4.0),
    "Bingham": ('law = "bingham"\nyield_stress = "3 Pa"\nplastic_viscosity = "20 mPa.s"', 100.0, 5.0),
    "Herschel-Bulkley": (
        'law = "herschel bulkley"\nyield_stress = "3 Pa"\nconsistency = "2 Pa.s^0.5"\nindex = 0.5',
        4.0,
        7.0,
    ),
    "Casson": ('law = "Casson"\nyield_stress = "4 Pa"\nplastic_viscosity = "1 Pa.s"', 9.0, 25.0),
    "Carreau-Yasuda": (
        'law = "carreau yasuda"\nzero_shear_viscosity = "9 Pa.s"\ninfinite_shear_viscosity = "1 Pa.s"\n'
        'time_constant = "1 s"\nindex = 0',
        math.sqrt(3.0),
        5 * math.sqrt(3.0),
    ),
    "Carreau-Yasuda with transition": (
        'law = "carreau yasuda"\nzero_shear_viscosity = "9 Pa.s"\ninfinite_shear_viscosity = "1 Pa.s"\n'
        'time_constant = "1 s"\nindex = 0\ntransition = 1',
        3.0,
        9.0,
    ),
    "Cross": (
        'law = "cross"\nzero_shear_viscosity = "9 Pa.s"\ninfinite_shear_viscosity = "1 Pa.s"\n'
        'time_constant = "500 ms"\nexponent = 1',
        6.0,
        18.0,
    ),
    "Ellis": (
        'law = "Ellis"\nzero_shear_viscosity = "10 Pa.s"\nhalf_stress = "2 Pa"\nexponent = 3',
        1.0,
        None,  # the law gives the rate: 2 Pa at half the zero-shear viscosity is 0.4 1/s
    ),
    "Sisko": (
        'law = "sisko"\ninfinite_shear_viscosity = "100 mPa.s"\nconsistency = "2 Pa.s^n"\nindex = 0.5',
        4.0,
        4.4,
    ),
    "Robertson-Stiff": (
        'law = "robertson stiff"\nconsistency = "2 Pa.s^n"\nindex = 0.5\nrate_shift = "5 1/s"',
        4.0,
        6.0,
    ),
    "flow curve": (CURVE, 10.0, 5.0),
}


@pytest.mark.parametrize("name", LAWS)
def test_laws(tmp_path, name):
    text, rate, stress = LAWS[name]
    fluid = read_case(write(tmp_path, fluid=f"[fluid]\n{text}\n")).fluid
    if name == "Ellis":
        rate, stress = 0.4, 2.0
    assert float(fluid.stress(rate)) == pytest.approx(stress, rel=1e-10)


def test_flow_curve_from_a_csv_file(tmp_path):
    (tmp_path / "curve.csv").write_text(
        "shear_stress [kPa], shear_rate [1/min]\n0.001,60\n0.005,600\n\n2e-2,6000\n"
    )
    listed = read_case(write(tmp_path, fluid=f"[fluid]\n{CURVE}\n")).fluid
    from_file = read_case(write(tmp_path, fluid='[fluid]\nlaw = "flow curve"\nfile = "curve.csv"\n')).fluid
    rates = np.array([1.0, 3.0, 10.0, 70.0])
    assert from_file.stress(rates) == pytest.approx(listed.stress(rates), rel=1e-12)


def test_duties(tmp_path):
    dense = FLUID + 'density = "1200 kg/m^3"\n'
    flow = read_case(write(tmp_path, duty='[duty]\nflow_rate = "300 L/min"\naccuracy = 0.005\n'))
    assert (flow.flow_rate, flow.pressure_gradient, flow.accuracy) == (0.005, None, 0.005)
    mass = read_case(write(tmp_path, fluid=dense, duty='[duty]\nflow_rate = "2160 kg/h"\naccuracy = "2 %"\n'))
    assert mass.flow_rate == pytest.approx(5e-4) and mass.accuracy == 0.02
    assert mass.report[0].per_si * 5e-4 == pytest.approx(2160)
    drop = read_case(write(tmp_path, duty='[duty]\npressure_drop = "3 bar"\nlength = "2 m"\n'))
    assert (drop.pressure_gradient, drop.length) == (150000.0, 2.0)
    both = read_case(write(tmp_path, duty=DUTY + 'length = "2 m"\n'))
    assert (both.pressure_gradient, both.length) == (12000.0, 2.0)


# --- files that are no case --------------------------------------------------------------------------


def test_missing_file(tmp_path):
    assert refusal(tmp_path / "absent.toml").startswith("no such case file")


def test_what_is_no_ordinary_file():
    with pytest.raises(CaseError, match="^/dev/null: is not an ordinary file; give a case file$"):
        read_case("/dev/null")
    with pytest.raises(CaseError, match=r"^'a\\x00b': cannot read this case file \("):
        read_case("a\0b")


def test_folder(tmp_path):
    assert refusal(tmp_path).startswith("is a folder; give a case file")


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "the file is empty; a case needs [section], [fluid] and [duty]"),
        (b" \n\n", "the file is empty"),
        (b"\x89PNG\r\n\x1a\n\x00\x00", "is not a text file"),
        (b'title = "a\x00b"', "is not a text file"),
        (b"title = \xff", "is not a text file"),
        (b"[section]\nwidth = 20 mm\n", "line 2: not valid TOML: "),
        (b"[section]\n[section]\n", "line 2: not valid TOML: "),
        (b"[section\n", "line 1: not valid TOML: "),
        (b'[section]\nwidth = "20 mm', "not valid TOML: "),
        (b"a = " + b"[" * 5000, "nested too deeply"),
        (b"a = " + b"9" * 5000, "not valid TOML: "),
        (b"# " + b"x" * 2_000_000, "is larger than 2 MB"),
    ],
)
def test_content_that_is_no_case(tmp_path, content, message):
    path = tmp_path / "case.toml"
    path.write_bytes(content)
    assert message in refusal(path)


def test_toml_error_shows_the_line(tmp_path):
    line = refusal(write(tmp_path, section='[section]\nshape = "circle"\ndiameter = 20 mm\n'))
    assert line.startswith("line 4: ")
    assert "'diameter = 20 mm'" in line and 'quotes, as in width = "20 mm"' in line


# --- keys and values that are wrong ------------------------------------------------------------------

REFUSED = [
    # the tables
    ({"section": ""}, "missing [section]; a case needs [section], [fluid] and [duty]"),
    ({"section": "", "duty": ""}, "missing [section] and [duty]"),
    ({"top": 'titel = "A"'}, 'titel: unknown key; did you mean "title"?'),
    ({"report": "[reprot]"}, 'reprot: unknown key; did you mean "report"?'),
    ({"section": "", "top": 'section = "circle"'}, "section: must be a table"),
    ({"section": "[[section]]"}, "section: must be a table"),
    ({"top": "title = 3"}, "title: found a number where text belongs"),
    ({"top": 'title = ""'}, "title: found nothing where text belongs"),
    ({"top": 'title = "\\u001b[2J"'}, "title: '\\x1b[2J' holds characters that cannot be printed"),
    # the section
    ({"section": "[section]"}, "[section]: missing shape; it is one of rectangle, circle,"),
    (
        {"section": '[section]\nshape = "rectangel"'},
        "[section] shape: unknown shape 'rectangel'; did you mean",
    ),
    ({"section": "[section]\nshape = 3"}, "[section] shape: found a number where text belongs"),
    ({"section": SECTION.replace("width", "widht")}, '[section] widht: unknown key; did you mean "width"?'),
    ({"section": SECTION + '"a\\nb" = 1'}, "[section] a\\nb: unknown key"),
    ({"section": '[section]\nshape = "rectangle"\nwidth = "1 m"'}, "[section]: missing height; a section of"),
    ({"section": '[section]\nshape = "rectangle"'}, "[section]: missing width and height"),
    (
        {"section": SECTION.replace('"20 mm"', "20")},
        '[section] width: 20 is missing its unit: write e.g. "20 mm"',
    ),
    ({"section": SECTION.replace('"20 mm"', "nan")}, "[section] width: nan is not a finite number"),
    ({"section": SECTION.replace('"20 mm"', "true")}, "[section] width: found true"),
    ({"section": SECTION.replace('"20 mm"', "2024-01-01")}, "[section] width: found a date or time"),
    ({"section": SECTION.replace("20 mm", "-20 mm")}, "[section] width: '-20 mm' is negative"),
    ({"section": SECTION.replace("20 mm", "0 mm")}, "[section] width: '0 mm' must be above zero"),
    (
        {"section": SECTION.replace("20 mm", "20 s")},
        "[section] width: 's' is not a unit of length but of time",
    ),
    ({"section": SECTION + "eccentricity = 0.1"}, "[section] eccentricity: unknown key"),
    # the fluid
    ({"fluid": "[fluid]"}, "[fluid]: missing law; it is one of Newtonian"),
    ({"fluid": '[fluid]\nlaw = "Binghm"'}, "[fluid] law: unknown law 'Binghm'; did you mean \"Bingham\"?"),
    (
        {"fluid": '[fluid]\nlaw = "Bingham"'},
        "[fluid]: missing yield_stress and plastic_viscosity; the Bingham law",
    ),
    ({"fluid": FLUID.replace("index", "n")}, "[fluid] n: unknown key"),
    ({"fluid": FLUID.replace("0.45", '"0.45"')}, "[fluid] index: found text where a plain number belongs"),
    ({"fluid": FLUID.replace("0.45", "inf")}, "[fluid] index: found inf"),
    ({"fluid": FLUID.replace("0.45", "true")}, "[fluid] index: found true"),
    ({"fluid": FLUID.replace("0.45", "-0.45")}, "[fluid]: power law: index is -0.45"),
    ({"fluid": FLUID.replace("s^n", "s^0.5")}, "[fluid] consistency: 'Pa.s^0.5' has s to the power 0.5 but"),
    ({"fluid": FLUID.replace('"0.6 Pa.s^n"', "0.6")}, "[fluid] consistency: 0.6 is missing its unit"),
    ({"fluid": FLUID.replace("0.6 Pa", "0 Pa")}, "[fluid]: power law: consistency is 0"),
    ({"fluid": FLUID + 'density = "0 kg/m3"'}, "[fluid] density: '0 kg/m3' must be above zero"),
    ({"fluid": FLUID + 'density = "12 kg"'}, "[fluid] density: 'kg' is not a unit of density"),
    # the duty
    (
        {"duty": "[duty]"},
        "[duty]: give one of pressure_gradient, flow_rate, or pressure_drop with length; found none",
    ),
    (
        {"duty": DUTY + 'flow_rate = "3 L/min"'},
        "[duty]: give one of pressure_gradient, flow_rate, or pressure_drop",
    ),
    ({"duty": '[duty]\npressure_drop = "3 bar"'}, "[duty] pressure_drop: a pressure drop needs the length"),
    ({"duty": '[duty]\nflow_rate = "0 L/min"'}, "[duty] flow_rate: '0 L/min' must be above zero"),
    (
        {"duty": '[duty]\nflow_rate = "3 m"'},
        "[duty] flow_rate: 'm' is not a unit of volume flow but of length",
    ),
    ({"duty": "[duty]\nflow_rate = 3"}, "[duty] flow_rate: 3 is missing its unit"),
    ({"duty": '[duty]\nflow_rate = "3 kg/h"'}, "[duty] flow_rate: '3 kg/h' is a mass flow: give density"),
    ({"duty": DUTY + "length = 2"}, "[duty] length: 2 is missing its unit"),
    ({"duty": DUTY + "accuracy = 1"}, "[duty] accuracy: 1 is not a share between 0 and 100 %"),
    ({"duty": DUTY + "acuracy = 1"}, '[duty] acuracy: unknown key; did you mean "accuracy"?'),
    # the report
    (
        {"report": '[report]\nlength = "psi"'},
        "[report] length: 'psi' is not a unit of length but of pressure or stress",
    ),
    ({"report": '[report]\nflow_rate = "kg/h"'}, "[report] flow_rate: 'kg/h' is a mass flow: give density"),
    ({"report": "[report]\nlength = 1"}, "[report] length: found a number where text belongs"),
    ({"report": '[report]\ncolour = "m"'}, "[report] colour: unknown key"),
]


@pytest.mark.parametrize(("parts", "message"), REFUSED)
def test_one_line_names_the_file_and_the_key(tmp_path, parts, message):
    assert refusal(write(tmp_path, **parts)).startswith(message)


ANNULUS = '[section]\nshape = "annulus"\nouter_diameter = "60 mm"\ninner_diameter = "40 mm"\n'


def test_two_duties_are_both_named(tmp_path):
    line = refusal(write(tmp_path, duty=DUTY + 'pressure_drop = "3 bar"'))
    assert line.endswith("; found pressure_gradient and pressure_drop")


@pytest.mark.parametrize(
    ("section", "message"),
    [
        (ANNULUS + "eccentricity = 1.2", "[section] eccentricity: eccentricity 1.2 must lie between 0 "),
        (ANNULUS + 'eccentricity = "0.5"', "[section] eccentricity: found text where a plain number belongs"),
        (ANNULUS + 'eccentricity = 0.5\noffset = "1 mm"', "[section]: gives both eccentricity and offset"),
        (ANNULUS + "eccentricity = -0.1", "[section] eccentricity: eccentricity -0.1 must lie between 0 "),
        (ANNULUS + 'offset = "9.95 mm"', "[section] offset: eccentricity 0.995 must lie between 0 "),
        (ANNULUS + 'offset = "11 mm"', "[section] offset: 0.011 m exceeds the mean gap of 0.01 m"),
        (ANNULUS.replace("40", "70"), "[section]: outer_diameter 0.06 m must exceed inner_diameter 0.07 m"),
        (ANNULUS.replace("40", "70") + 'offset = "1 mm"', "[section]: outer_diameter 0.06 m must exceed"),
    ],
)
def test_annulus_refused(tmp_path, section, message):
    assert refusal(write(tmp_path, section=section + "\n")).startswith(message)


@pytest.mark.parametrize(
    ("fluid", "message"),
    [
        ('law = "flow curve"', "[fluid]: missing shear_rate and shear_stress"),
        (
            CURVE.replace("[60, 600, 6000]", "60"),
            "[fluid] shear_rate: lists numbers and their unit; write e.g.",
        ),
        (CURVE.replace("600,", "true,"), "[fluid] shear_rate: value 2 is True, not a number of 0 or above"),
        (CURVE.replace("600,", "nan,"), "[fluid] shear_rate: value 2 is nan"),
        (CURVE.replace("600,", "-1,"), "[fluid] shear_rate: value 2 is -1"),
        (CURVE.replace("600,", "[1],"), "[fluid] shear_rate: value 2 is [1]"),
        (
            CURVE.replace("1/min", "m"),
            "[fluid] shear_rate unit: 'm' is not a unit of shear rate but of length",
        ),
        (CURVE.replace("unit", "units", 1), '[fluid] shear_rate units: unknown key; did you mean "unit"?'),
        (CURVE.replace(", 0.02]", "]"), "[fluid]: "),
        (CURVE.replace("0.005", "0.0005"), "[fluid]: "),
        (CURVE + '\nfile = "curve.csv"', "[fluid] shear_rate: unknown key"),
    ],
)
def test_flow_curve_refused(tmp_path, fluid, message):
    assert refusal(write(tmp_path, fluid=f"[fluid]\n{fluid}\n")).startswith(message)


@pytest.mark.parametrize(
    ("content", "message"),
    [
        ("", "the file is empty; it should start with"),
        ("shear_rate,shear_stress\n1,2\n", "the first line should name two columns and their units"),
        ("shear_rate [1/s],shear_rate [1/s]\n1,2\n", "the first line should name two columns"),
        ("shear_rate [1/s],shear_stress [m]\n1,2\n", "shear_stress: 'm' is not a unit of stress"),
        ("shear_rate [1/s],shear_stress [Pa]\n1,2\n3\n", "point 2 has 1 values, not 2"),
        ("shear_rate [1/s],shear_stress [Pa]\n1,2\n3,x\n", "point 2: 'x' is not a number of 0 or above"),
        ("shear_rate [1/s],shear_stress [Pa]\n1,2\n3,nan\n", "point 2: 'nan' is not a number"),
        ("shear_rate [1/s],shear_stress [Pa]\n-1,2\n", "point 1: '-1' is not a number of 0 or above"),
    ],
)
def test_flow_curve_file_refused(tmp_path, content, message):
    curve = tmp_path / "curve.csv"
    curve.write_text(content)
    path = write(tmp_path, fluid='[fluid]\nlaw = "flow curve"\nfile = "curve.csv"\n')
    with pytest.raises(CaseError, match=f"^{re.escape(str(curve))}: {re.escape(message)}"):
        read_case(path)
    curve.unlink()
    with pytest.raises(CaseError, match="curve.csv: no such flow curve file"):
        read_case(path)


# --- sections from files, and the cases that come with the project -----------------------------------

FILE = '[section]\nshape = "file"\nfile = "{}"\nunit = "{}"\n'


def test_section_file_is_found_beside_the_case_and_scaled(tmp_path):
    shutil.copy(GEOMETRIES / "imported_mesh.msh", tmp_path / "duct.msh")
    small = read_case(write(tmp_path, section=FILE.format("duct.msh", "mm"))).section
    large = read_case(write(tmp_path, section=FILE.format("duct.msh", "in"))).section
    assert large.area / small.area == pytest.approx(25.4**2, rel=1e-12)
    assert large.perimeter / small.perimeter == pytest.approx(25.4, rel=1e-12)


def test_section_file_refused(tmp_path):
    assert refusal(write(tmp_path, section=FILE.format("absent.msh", "mm"))).startswith("[section] file: ")
    assert refusal(write(tmp_path, section=FILE.format("duct.msh", "kg"))).startswith(
        "[section] unit: 'kg' is not"
    )


@pytest.mark.parametrize("path", sorted(GEOMETRIES.glob("*.toml")), ids=lambda path: path.stem)
def test_cases_of_the_project_read(path):
    case = read_case(path)
    assert path.read_text().startswith("# ")
    assert (case.pressure_gradient is None) != (case.flow_rate is None)
    assert case.section.area > 0 and case.density > 0
    assert len({item.quantity for item in case.report}) == len(case.report)


def test_imported_mesh_is_the_rounded_trapezoid_it_should_be():
    # Trapezoid of 30 and 50 mm by 24 mm; each corner of angle t loses r^2 (cot(t/2) - (pi - t)/2), r = 5 mm.
    base = math.atan2(24, 10)
    lost = sum(2 * 25 * (1 / math.tan(t / 2) - (math.pi - t) / 2) for t in (base, math.pi - base))
    section = read_case(GEOMETRIES / "imported_mesh.toml").section
    # The chords of the arcs lie inside, hence the tolerance.
    assert section.area * 1e6 == pytest.approx(40 * 24 - lost, rel=0.005)


def test_importing_the_reader_loads_nothing_heavy():
    code = "import sys, ductsolve.app.case; print(sorted({'pint', 'numpy', 'meshio'} & set(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
