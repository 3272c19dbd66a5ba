"""Steels of the user's own: what is read, what is refused and why, word for word."""

from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.thermo.certificate import (
    Certificate,
    CertificateFaults,
    deviations,
    read_certificates,
    read_steels,
)
from midradius.thermo.errors import InputFault
from midradius.thermo.grades import find, limits
from midradius.thermo.steel import ELEMENTS, HARD_BOUNDS, Composition, check

SAMPLES = Path(__file__).resolve().parents[2] / "meshes"


def written(folder: Path, text: str, name: str = "own.csv") -> Path:
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return path


def faults_of(path: Path) -> list[str]:
    with pytest.raises(CertificateFaults) as caught:
        read_steels(path)
    assert str(caught.value) == "\n".join(str(fault) for fault in caught.value.faults)
    assert caught.value.quantity == caught.value.faults[0].quantity
    return [str(fault).removeprefix(f"steels {path.name}, ") for fault in caught.value.faults]


def certificate(grade: str = "42CrMo4", **amounts: float) -> Certificate:
    given = tuple(element for element in ELEMENTS if element in amounts)
    return Certificate("a heat", "", "Hallgrund Forge", grade, "", Composition(**amounts), given)


@pytest.mark.parametrize("suffix", ["toml", "csv"])
def test_the_samples_can_be_computed(suffix: str) -> None:
    steels = read_steels(SAMPLES / f"steels-hallgrund.{suffix}")
    assert len(steels) == 3
    for steel in steels:
        assert check(steel.composition) == []
        assert steel.status == "given"
        assert "Hallgrund Forge" in steel.standard


def test_a_csv_row_becomes_a_steel(tmp_path: Path) -> None:
    path = written(
        tmp_path,
        "# invented\nheat,works,grade,C,MN,Cr %,B [ppm],N_ppm\n\n"
        "H 7,Hallgrund Forge,4140,0.41,0.83,1.02,18,75\n",
    )
    (item,) = read_certificates(path)
    assert (item.name, item.heat, item.works, item.grade) == (
        "H 7",
        "H 7",
        "Hallgrund Forge",
        "4140",
    )
    assert item.given == ("C", "Mn", "Cr", "N", "B")
    assert item.composition == Composition(C=0.41, Mn=0.83, Cr=1.02, B=0.0018, N=0.0075)
    assert item.steel.name == "H 7"
    assert item.steel.standard == "certificate, Hallgrund Forge, heat H 7"
    assert item.steel.status == "given"


@pytest.mark.parametrize("separator", [";", "\t"])
def test_a_decimal_comma_is_read_where_columns_are_not_split_by_commas(
    tmp_path: Path, separator: str
) -> None:
    rows = (("name", "C", "Mn"), ("a", "0,41", "0.83"))
    path = written(tmp_path, "\n".join(separator.join(row) for row in rows))
    assert read_steels(path)[0].composition == Composition(C=0.41, Mn=0.83)


def test_a_decimal_comma_between_commas_is_refused(tmp_path: Path) -> None:
    path = written(tmp_path, "name,C,Mn\na,0,41,0,83\n")
    with pytest.raises(InputFault) as caught:
        read_steels(path)
    assert str(caught.value) == (
        "steels own.csv, line 2 = 5 cells, but must be at most 3, one under each head. "
        "With a decimal comma separate the columns by semicolons."
    )


def test_a_toml_table_becomes_a_grade_of_ones_own(tmp_path: Path) -> None:
    text = """
    [[steel]]
    name = "HF 35"
    heat = 4711
    standard = "works standard HF 12"
    [steel.analysis]
    C = 0.35
    Mn = 1
    N_ppm = 80
    """
    (item,) = read_certificates(written(tmp_path, text, "own.toml"))
    assert item.heat == "4711"
    assert item.steel.standard == "works standard HF 12, heat 4711"
    assert item.composition == Composition(C=0.35, Mn=1.0, N=0.008)


@given(
    st.dictionaries(
        st.sampled_from(ELEMENTS[1:]), st.floats(0.0, 1.0).map(lambda x: round(x, 4)), max_size=8
    ),
    st.floats(0.03, 1.5).map(lambda x: round(x, 3)),
)
def test_an_analysis_reads_the_same_from_both_forms(
    tmp_path_factory: pytest.TempPathFactory, shares: dict[str, float], carbon: float
) -> None:
    amounts = {"C": carbon}
    amounts |= {element: share * HARD_BOUNDS[element][1] for element, share in shares.items()}
    if check(Composition(**amounts)):
        return
    folder = tmp_path_factory.mktemp("steels")
    rows = (["name", *amounts], ["a", *(repr(amount) for amount in amounts.values())])
    table = "\n".join(",".join(row) for row in rows)
    inline = ", ".join(f"{element} = {amount!r}" for element, amount in amounts.items())
    toml = f'[[steel]]\nname = "a"\nanalysis = {{ {inline} }}\n'
    from_csv = read_certificates(written(folder, table))
    from_toml = read_certificates(written(folder, toml, "own.toml"))
    assert from_csv == from_toml
    assert from_csv[0].composition == Composition(**amounts)


def test_all_faults_of_a_table_come_together(tmp_path: Path) -> None:
    text = (
        "heat,grade,C,Mn,Sn,Xx\n"
        "H1,42CrMo5,0.42,0.75,0.010,1\n"
        "H2,,,0.75,0.008,1\n"
        "h 1,,0.42,<0.1,,\n"
        "1045,,0.42,,,\n"
    )
    known = ", ".join(ELEMENTS)
    assert faults_of(written(tmp_path, text)) == [
        'line 2: grade = "42CrMo5", but must be a grade of the shipped table. '
        "Nearest: 42CrMo4, G42CrMo4, 42CrMoS4. Or leave it out.",
        f'line 2: element = "Sn", but must be one of {known}. '
        "No model here knows this element: leave it out.",
        f'line 2: element = "Xx", but must be one of {known}.',
        "line 3: C = missing, but must be 0.03 to 1.5 % by mass. Carbon decides everything else.",
        'line 4: Mn = "<0.1", but must be a finite number in mass percent. '
        "Below what was detected: write 0 or leave it out.",
        'line 4: name = "h 1", but must be a name that line 2 does not have. '
        "Two analyses of one heat need two names.",
        'line 5: name = "1045", but must be a name of its own, not that of a shipped grade. '
        "If 1045 was ordered, write that as grade and name the heat otherwise.",
    ]


def test_all_faults_of_a_toml_file_come_together(tmp_path: Path) -> None:
    text = """[[steel]]
nme = "a"
analysis = { C = true, Mn = 0.7, MN = 0.8, Cb = 0.1, Fe = 98 }
[[steel]]
heat = "a\\nb"
C = 0.4
analysis = { C = 0.4, Cr = 3.9, Ni = 4.9 }
"""
    known = ", ".join(ELEMENTS)
    keys = "name, heat, works, grade, standard, analysis"
    assert faults_of(written(tmp_path, text, "own.toml")) == [
        f'line 1: steel[0].key = "nme", but must be one of {keys}. Nearest: "name".',
        "line 1: steel[0].name = missing, but must be given, or else the heat.",
        "line 1: steel[0].analysis.C = true, but must be a finite number in mass percent. "
        "Write the number alone.",
        "line 1: steel[0].analysis.MN = 0.8, but must be given once, as Mn.",
        f'line 1: steel[0].element = "Cb", but must be one of {known}. Write "Nb".',
        f'line 1: steel[0].element = "Fe", but must be one of {known}. '
        "Iron is the rest: leave it out.",
        'line 4: steel[1].heat = "a?b", but must be a text of 1 to 60 characters on one line.',
        f'line 4: steel[1].key = "C", but must be one of {keys}. Elements stand in its analysis.',
        "line 4: steel[1].Mn + Si + Cr + Ni + Mo = 8.8 %, but must be at most 8 % by mass. "
        "The models hold for low-alloy steels only.",
    ]


@pytest.mark.parametrize(
    ("key", "value", "said"),
    [
        ("B", "25", "B = 25 %, but must be 0 to 0.01 % by mass. It looks like ppm: write 0.0025, "
         "or name it B_ppm."),
        ("N", "80", "N = 80 %, but must be 0 to 0.05 % by mass. It looks like ppm: write 0.008, "
         "or name it N_ppm."),
        ("N_ppm", "0.008", 'N_ppm = "0.008", but must be 0, or at least 1 ppm. It looks like mass '
         "percent: leave ppm out of the key."),
        ("Mn", "75", "Mn = 75 %, but must be 0 to 3 % by mass. Certificates may print hundredths "
         "or thousandths: give mass percent."),
        ("Mn", "0.75 %", 'Mn = "0.75 %", but must be a finite number in mass percent. Write the '
         "number alone."),
        ("Mn", "nan", 'Mn = "nan", but must be a finite number in mass percent. Write the number '
         "alone."),
    ],
)  # fmt: skip
def test_an_amount_in_another_unit_is_refused(
    tmp_path: Path, key: str, value: str, said: str
) -> None:
    path = written(tmp_path, f"name,C,{key}\na,0.4,{value}\n")
    assert faults_of(path) == [f"line 2: {said}"]


@pytest.mark.parametrize(
    ("carbon", "hint"),
    [
        ("42", "It looks like hundredths of a percent: write 0.42."),
        ("0.0042", "It looks like a mass fraction: write 0.42, and the others likewise."),
        ("0.02", "With less carbon than this there is no hardening to compute."),
        ("2.1", "The models hold for plain carbon and low-alloy steels only."),
    ],
)
def test_an_absurd_carbon_says_what_it_may_be(tmp_path: Path, carbon: str, hint: str) -> None:
    (fault,) = faults_of(written(tmp_path, f"name,C\na,{carbon}\n"))
    assert fault == f"line 2: C = {float(carbon):g} %, but must be 0.03 to 1.5 % by mass. {hint}"


@pytest.mark.parametrize(
    ("name", "text", "said"),
    [
        ("own.txt", "", "but must be a file that ends in .toml or .csv."),
        ("own.csv", "", "own.csv = 0 steels, but must be 1 to 1000 steels."),
        ("own.csv", "name,C\n" + "a,0.4\n" * 1001, "own.csv = 1001 steels, but must be 1 to"),
        ("own.csv", "name,C,C\n", 'line 1 = head "C" twice, but must be a head of its own'),
        ("own.csv", "name,,C\n", "line 1 = an empty head, but must be a head over each column."),
        ("own.csv", "name\0,C\n", "own.csv = binary data, but must be a text file."),
        ("own.toml", "", "own.toml = 0 steels, but must be 1 to 1000 steels. Write [[steel]]."),
        ("own.toml", "[steel]\n", "own.toml = steel, but must be [[steel]] tables."),
        ("own.toml", "x = 1\n", 'own.toml = key "x", but must be [[steel]] tables only.'),
        ("own.toml", "[[steel]\n", "own.toml = this text, but must be TOML."),
        ("own.toml", "[[steel]]\nanalysis = 3\n", "steel[0].analysis = 3, but must be a table"),
    ],
)
def test_a_file_that_is_no_table_of_steels_is_refused(
    tmp_path: Path, name: str, text: str, said: str
) -> None:
    with pytest.raises(InputFault) as caught:
        read_steels(written(tmp_path, text, name))
    assert said in str(caught.value)
    assert not isinstance(caught.value, CertificateFaults)


def test_a_file_that_is_not_there_is_named(tmp_path: Path) -> None:
    with pytest.raises(InputFault, match="No such file or directory. Check the path."):
        read_steels(tmp_path / "none.csv")


def test_a_spreadsheet_export_of_older_encoding_is_read(tmp_path: Path) -> None:
    path = tmp_path / "own.csv"
    path.write_bytes("name;works;C\nH 7;Hüttenwerk;0,42\n".encode("latin-1"))
    assert read_certificates(path)[0].works == "Hüttenwerk"


def test_a_heat_within_the_limits_deviates_nowhere() -> None:
    # limits of 1.7225 from memory, EN ISO 683-2: both ends belong to the range
    assert deviations(certificate(C=0.38, Mn=0.90, Cr=0.90, Mo=0.30, P=0.025, S=0.035)) == ()


def test_a_deviation_says_the_limit_and_the_standard() -> None:
    notes = deviations(certificate(C=0.46, Mn=0.75, Cr=0.85, P=0.031, Al=0.02))
    assert [str(note) for note in notes] == [
        "limits of 42CrMo4, EN ISO 683-2: C = 0.46 %, source holds for 0.38 to 0.45 %",
        "limits of 42CrMo4, EN ISO 683-2: Cr = 0.85 %, source holds for 0.9 to 1.2 %",
        "limits of 42CrMo4, EN ISO 683-2: Mo = not given, source holds for 0.15 to 0.3 %",
        "limits of 42CrMo4, EN ISO 683-2: P = 0.031 %, source holds for at most 0.025 %",
    ]


def test_a_limit_without_an_upper_end_is_only_a_lower_one() -> None:
    amounts = {"C": 0.50, "Mn": 0.80, "Si": 0.25, "Cr": 0.95}
    assert deviations(certificate(V=0.4, **amounts), "6150") == ()
    (note,) = deviations(certificate(V=0.1, **amounts), "6150")
    assert (note.quantity, note.value, note.allowed) == ("V", "0.1 %", "at least 0.15 %")


def test_another_grade_than_the_ordered_one_can_be_asked_for() -> None:
    heat = certificate(grade="4140", C=0.37, Mn=1.05, Si=0.25, Cr=1.0, Mo=0.2)
    assert [note.quantity for note in deviations(heat)] == ["C", "Mn"]
    assert deviations(heat, "4140H") == ()
    with pytest.raises(InputFault, match="grade = not given, but must be the grade to hold"):
        deviations(certificate(grade="", C=0.4))


@pytest.mark.parametrize("item", find(), ids=lambda item: item.name)
def test_the_aim_of_a_grade_deviates_nowhere(item) -> None:  # type: ignore[no-untyped-def]
    aim = Certificate("x", "", "", item.name, "", item.steel.composition, ELEMENTS)
    assert deviations(aim) == ()


def test_a_sample_heat_with_too_little_chromium_is_told() -> None:
    by_heat = {item.heat: item for item in read_certificates(SAMPLES / "steels-hallgrund.toml")}
    assert deviations(by_heat["H 4711"]) == ()
    (note,) = deviations(by_heat["H 4725"])
    assert note.quantity == "Cr"
    low, _ = limits("42CrMo4")["Cr"]
    assert_allclose(by_heat["H 4725"].composition.Cr, low - 0.04, rtol=0.0, atol=1e-9)
