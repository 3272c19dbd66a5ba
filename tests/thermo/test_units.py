"""Units: exact factors by definition (SI Brochure 9th ed.; NIST SP 811:2008 appendix B)."""

import re
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.thermo import units
from midradius.thermo.errors import InputFault

# Text, kind, SI value written as exact arithmetic of the defining factors.
EXACT = [
    ("300 mm", "length", Fraction(3, 10)),
    ("300mm", "length", Fraction(3, 10)),
    ("12 cm", "length", Fraction(12, 100)),
    ("2.4 m", "length", Fraction(24, 10)),
    ("80 um", "length", Fraction(80, 10**6)),
    ("80 µm", "length", Fraction(80, 10**6)),
    ("11.8 in", "length", Fraction(118, 10) * Fraction(254, 10_000)),
    ("1 inch", "length", Fraction(254, 10_000)),
    ("10 ft", "length", Fraction(3048, 1000)),
    ("860 degC", "temperature", Fraction(113_315, 100)),
    ("860 °C", "temperature", Fraction(113_315, 100)),
    ("860 ℃", "temperature", Fraction(113_315, 100)),
    ("860 C", "temperature", Fraction(113_315, 100)),
    ("1133.15 K", "temperature", Fraction(113_315, 100)),
    ("1580 degF", "temperature", Fraction(113_315, 100)),
    ("-40 °F", "temperature", Fraction(23_315, 100)),
    ("32 F", "temperature", Fraction(27_315, 100)),
    ("0.5 K", "temperature difference", Fraction(1, 2)),
    ("45 s", "duration", Fraction(45)),
    ("1.5 min", "duration", Fraction(90)),
    ("4 h", "duration", Fraction(14_400)),
    ("2 d", "duration", Fraction(172_800)),
    ("4 h 30 min", "duration", Fraction(16_200)),
    ("1 d 2h 3 min 4.5s", "duration", Fraction(86_400 + 7_200 + 180) + Fraction(9, 2)),
    ("1e3 s", "duration", Fraction(1000)),
    ("600 W/(m2 K)", "heat-transfer coefficient", Fraction(600)),
    ("0.6 kW/m²K", "heat-transfer coefficient", Fraction(600)),
    ("2 t", "mass", Fraction(2000)),
    ("100 lb", "mass", Fraction(45_359_237, 10**6)),
    ("20 m3", "volume", Fraction(20)),
    ("500 L", "volume", Fraction(1, 2)),
    ("1 gal", "volume", Fraction(231) * Fraction(254, 10_000) ** 3),
    ("2 ft/s", "velocity", Fraction(6096, 10_000)),
    ("10 bar", "pressure", Fraction(10**6)),
    ("250 kW", "power", Fraction(250_000)),
]


@pytest.mark.parametrize(("text", "kind", "expected"), EXACT)
def test_a_text_is_the_defined_factor_rounded_once(
    text: str, kind: units.Kind, expected: Fraction
) -> None:
    assert_allclose(units.parse(text, kind), float(expected), rtol=0.0, atol=0.0)


def test_derived_units_follow_from_pound_foot_and_second() -> None:
    pound_force = 0.45359237 * 9.80665
    foot = 0.3048
    psi = units.parse("1 psi", "pressure")
    assert_allclose(psi, pound_force / 0.0254**2, rtol=1e-15, atol=0.0)
    horse = units.parse("1 hp", "power")
    assert_allclose(horse, 550.0 * foot * pound_force, rtol=1e-15, atol=0.0)
    film = units.parse("1 BTU/(h ft2 degF)", "heat-transfer coefficient")
    btu = 1055.05585262  # international table, SP 811 appendix B.8
    assert_allclose(film, btu / (3600.0 * foot**2 * 5.0 / 9.0), rtol=1e-15, atol=0.0)


LENGTH = "a length in mm, cm, m, um, in or ft"
TEMPERATURE = "a temperature in degC, K or degF"
DURATION = "a duration in s, min, h or d"
FAULTS = [
    (
        300,
        "length",
        f"length = 300, but must be {LENGTH}. "
        'Write number and unit in quotes, for example "300 mm".',
    ),
    (
        True,
        "length",
        f"length = True, but must be {LENGTH}. "
        'Write number and unit in quotes, for example "300 mm".',
    ),
    (
        "300",
        "length",
        f'length = "300", but must be {LENGTH}. Add the unit, for example "300 mm".',
    ),
    (
        "1,5 mm",
        "length",
        f'length = "1,5 mm", but must be {LENGTH}. Write "1.5 mm": the decimal sign is a point.',
    ),
    (
        "1,500 mm",
        "length",
        f'length = "1,500 mm", but must be {LENGTH}. '
        'Write "1.500 mm" or "1500 mm", whichever is meant.',
    ),
    ("nan mm", "length", f'length = "nan mm", but must be {LENGTH}. Write a finite number.'),
    ("-inf mm", "length", f'length = "-inf mm", but must be {LENGTH}. Write a finite number.'),
    ("1e400 mm", "length", f'length = "1e400 mm", but must be {LENGTH}. Write a finite number.'),
    (
        "2*3 mm",
        "length",
        f'length = "2*3 mm", but must be {LENGTH}. '
        "Write one number and one unit, without arithmetic.",
    ),
    (
        "",
        "length",
        f'length = "", but must be {LENGTH}. Write one number and one unit, without arithmetic.',
    ),
    (
        "300 degC",
        "length",
        f'length = "300 degC", but must be {LENGTH}. '
        '"degC" is a unit of temperature; write for example "300 mm".',
    ),
    (
        "300 MM",
        "length",
        f'length = "300 MM", but must be {LENGTH}. '
        'The unit "MM" is not known; write "300 mm" if that is meant.',
    ),
    (
        "200 HV",
        "length",
        f'length = "200 HV", but must be {LENGTH}. '
        'The unit "HV" is not known; write for example "300 mm".',
    ),
    (
        "60 deg",
        "temperature",
        f'temperature = "60 deg", but must be {TEMPERATURE}. '
        'The unit "deg" is not known; write "60 degC" if that is meant.',
    ),
    (
        "-300 degC",
        "temperature",
        f'temperature = "-300 degC", but must be {TEMPERATURE}. '
        "Nothing is colder than -273.15 degC.",
    ),
    (
        "0.5 degC",
        "temperature difference",
        'temperature difference = "0.5 degC", but must be a temperature difference in K. '
        "A difference is given in K; a step of 1 degC is 1 K.",
    ),
    (
        "10 degC/s",
        "temperature",
        f'temperature = "10 degC/s", but must be {TEMPERATURE}. '
        'The unit "degC/s" is not known; write for example "860 degC".',
    ),
    (
        "5 m",
        "duration",
        f'duration = "5 m", but must be {DURATION}. "m" is the metre; for minutes write "5 min".',
    ),
    (
        "5 hours",
        "duration",
        f'duration = "5 hours", but must be {DURATION}. '
        'The unit "hours" is not known; write "5 h" if that is meant.',
    ),
    (
        "30 min 4 h",
        "duration",
        f'duration = "30 min 4 h", but must be {DURATION}. '
        'Write each unit once, the largest first, such as "4 h 30 min".',
    ),
]


@pytest.mark.parametrize(("text", "kind", "message"), FAULTS)
def test_a_wrong_text_is_answered_with_its_cure(
    text: object, kind: units.Kind, message: str
) -> None:
    with pytest.raises(InputFault) as caught:
        units.parse(text, kind)
    assert str(caught.value) == message


def test_a_number_of_endless_size_is_refused_at_once() -> None:
    for text in ("1e999999999999 mm", "9" * 5000 + " mm"):
        with pytest.raises(InputFault):
            units.parse(text, "length")


def test_an_endless_text_is_refused_and_not_repeated_whole() -> None:
    with pytest.raises(InputFault, match="Write one number and one unit") as caught:
        units.parse("300." + "0" * 1000 + " mm", "length")
    assert len(str(caught.value)) < 200


@pytest.mark.parametrize("kind", units.KINDS)
def test_an_example_of_each_kind_parses(kind: units.Kind) -> None:
    assert units.parse(units.example(kind), kind) > 0.0


@given(
    value=st.floats(min_value=1e-300, max_value=1e300),
    kind=st.sampled_from(units.KINDS),
)
def test_showing_then_parsing_is_the_identity(value: float, kind: units.Kind) -> None:
    assert units.parse(units.show(value, kind), kind) == value


def test_a_value_is_shown_in_the_unit_of_the_trade() -> None:
    assert units.show(0.3, "length") == "300 mm"
    assert units.show(1133.15, "temperature") == "860 degC"
    assert units.show(16_200.0, "duration") == "4.5 h"
    assert units.show(45.0, "duration") == "45 s"


@given(
    number=st.from_regex(r"\A[+-]?[0-9]{1,3}(\.[0-9]{1,3})?(e[0-9])?\Z"),
    gap=st.sampled_from(["", " ", "  "]),
    unit=st.sampled_from(sorted({name for table in units.UNITS.values() for name in table})),
    kind=st.sampled_from(units.KINDS),
)
def test_the_pattern_for_editors_agrees_with_the_parser(
    number: str, gap: str, unit: str, kind: units.Kind
) -> None:
    text = number + gap + unit
    matches = re.search(units.pattern(kind), text) is not None
    try:
        units.parse(text, kind)
        assert matches
    except InputFault as fault:
        assert not matches or "colder" in fault.remedy
