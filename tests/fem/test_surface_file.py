"""A film curve from a user's own file: what is understood and what is refused."""

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from midradius.fem.filmfile import read_curve
from midradius.fem.surface import beyond, film_from_csv
from midradius.thermo.errors import InputFault

Write = Callable[[str | bytes], Path]

HEADS = "surface_degC, htc_W_per_m2K\n"

UNDERSTOOD = {
    "heads and commas": HEADS + "60, 250\n455, 4800.5\n900, 640\n",
    "no heads": "60,250\n455,4800.5\n900,640\n",
    "semicolons": "surface_degC;htc_W_per_m2K\n60;250\n455;4800.5\n900;640\n",
    "decimal commas": "60,0;250\n455;4800,5\n9,0e2;640\n".replace("9,0e2", "900,0"),
    "tabs": "60\t250\n455\t4800,5\n900\t640\n",
    "blanks": "60 250\n 455   4800.5\n900 640\n",
    "falling": "900, 640\n455, 4800.5\n60, 250\n",
    "comments and empty lines": "# bath 3\n\n" + HEADS + "60,250 # bath\n\n455,4800.5\n900,640\n",
    "trailing separators": "60,250,\n455,4800.5,\n900,640,,\n",
    "quotes": '"surface_degC","htc_W_per_m2K"\n"60","250"\n"455","4800.5"\n"900","640"\n',
    "other heads": "T [°C]; h [W/m²K]\n60; 250\n455; 4800.5\n900; 640\n",
    "windows line ends": "60,250\r\n455,4800.5\r\n900,640\r\n",
}


@pytest.fixture
def curve_file(tmp_path: Path) -> Write:
    def write(text: str | bytes) -> Path:
        path = tmp_path / "curve.csv"
        path.write_bytes(text if isinstance(text, bytes) else text.encode("utf-8"))
        return path

    return write


@pytest.mark.parametrize("text", UNDERSTOOD.values(), ids=UNDERSTOOD.keys())
def test_a_curve_is_understood_with(text: str, curve_file: Write) -> None:
    curve = film_from_csv(curve_file(text))
    assert_allclose(curve.temp, [333.15, 728.15, 1173.15], rtol=0.0, atol=1e-9)
    assert_allclose(curve.htc, [250.0, 4800.5, 640.0], rtol=1e-12, atol=0.0)


def test_a_byte_order_mark_and_old_encodings_do_no_harm(curve_file: Write) -> None:
    for data in (b"\xef\xbb\xbf60,250\n900,640\n", b"# \xd6l, 60 \xb0C\n60,250\n900,640\n"):
        surface, _ = read_curve(curve_file(data))
        assert_allclose(surface, [60.0, 900.0], rtol=0.0, atol=0.0)


def test_the_curve_carries_the_name_of_its_file_into_notes(curve_file: Write) -> None:
    curve = film_from_csv(curve_file("60,250\n900,640\n"))
    (note,) = beyond(curve, coldest=400.0, hottest=1273.15)
    assert str(note) == (
        'film curve "curve.csv": surface temperature = 1000 degC, source holds for 60 to 900 degC'
    )


REFUSED = {
    "empty": ("", "film curve.csv = 0 rows, but must be at least 2 rows."),
    "one row": (HEADS + "60,250\n", "film curve.csv = 1 row, but must be at least 2 rows."),
    "turns back": (
        "60,250\n455,4800\n400,900\n",
        "film curve.csv, line 3: surface temperature = 400 beside 455 degC of line 2, "
        "but must be different from line to line and in one direction.",
    ),
    "twice": (
        "60,250\n455,4800\n455,900\n900,600\n",
        "film curve.csv, line 3: surface temperature = 455 beside 455 degC of line 2,",
    ),
    "negative": (
        "60,250\n900,-1\n",
        "film curve.csv, line 2: film coefficient = -1, but must be 0 to 100000 W/(m2 K).",
    ),
    "too strong": ("60,250\n900,2e6\n", "film coefficient = 2e+06"),
    "not a number": ("60,nan\n900,640\n", "film coefficient = nan"),
    "infinite": ("60,250\ninf,640\n", "surface temperature = inf"),
    "too hot": (
        "60,250\n1773,640\n",
        "film curve.csv, line 2: surface temperature = 1773, but must be -50 to 1500 degC.",
    ),
    "words": ("60,250\nmuch,640\n", 'film curve.csv, line 2 = "much", but must be a number.'),
    "one column": ("60\n900\n", "film curve.csv, line 1 = 1 column, but must be 2 columns."),
    "decimal commas between commas": ("60,0,250,5\n", "line 1 = 4 columns"),
    "three columns": ("60,250,1\n", "line 1 = 3 columns"),
    "kelvin by its heads": (
        "surface_K, htc_W_per_m2K\n333,250\n1173,640\n",
        'film curve.csv, line 1 = "surface_K, htc_W_per_m2K", but must be columns in the order '
        'and units of "surface_degC, htc_W_per_m2K".',
    ),
    "fahrenheit by its heads": ("surface degF, h\n140,250\n1650,640\n", "line 1"),
    "columns swapped": ("htc_W_per_m2K, surface_degC\n250,60\n640,900\n", "line 1"),
    "kilowatts by its heads": ("T degC; h kW/m2K\n60;0.25\n900;0.64\n", "line 1"),
    "imperial by its heads": ("T degC; h Btu/h ft2 F\n60;44\n900;112\n", "line 1"),
    "kelvin by its values": (
        "333,250\n1173,640\n",
        "film curve.csv: lowest surface temperature = 333, but must be below 250 degC in a file "
        "without the head surface_degC. It looks like kelvin.",
    ),
    "kilowatts by its values": (
        "60,0.25\n455,4.8\n900,0.64\n",
        "film curve.csv: highest film coefficient = 4.8, but must be at least 20 W/(m2 K) in a "
        "file without the head htc_W_per_m2K. It looks like kW/(m2 K).",
    ),
    "binary": (b"\x00\x01\x02", "film curve.csv = binary data, but must be a text file."),
}


@pytest.mark.parametrize(("text", "says"), REFUSED.values(), ids=REFUSED.keys())
def test_a_curve_is_refused_for_being(text: str | bytes, says: str, curve_file: Write) -> None:
    with pytest.raises(InputFault) as caught:
        film_from_csv(curve_file(text))
    assert says in str(caught.value)
    assert caught.value.remedy


def test_heads_with_units_overrule_the_suspicions(curve_file: Write) -> None:
    surface, htc = read_curve(curve_file(HEADS + "300, 4\n900, 12\n"))
    assert_allclose(surface, [300.0, 900.0], rtol=0.0, atol=0.0)
    assert_allclose(htc, [4.0, 12.0], rtol=0.0, atol=0.0)


def test_a_missing_file_is_named(tmp_path: Path) -> None:
    path = tmp_path / "none.csv"
    with pytest.raises(InputFault) as caught:
        film_from_csv(path)
    assert caught.value.value == f'"{path}"'
    assert caught.value.allowed == "a CSV file that can be read"


def test_an_endless_file_is_cut_off(curve_file: Write) -> None:
    with pytest.raises(InputFault, match="more than 10000 rows"):
        read_curve(curve_file("".join(f"{i * 0.01},100\n" for i in range(10_001))))


@given(
    temps=st.lists(st.integers(-50, 1500), min_size=2, max_size=30, unique=True),
    htc=st.floats(25.0, 99_000.0),
)
def test_any_rising_curve_comes_back_as_written(
    tmp_path_factory: pytest.TempPathFactory, temps: list[int], htc: float
) -> None:
    path = tmp_path_factory.mktemp("curve") / "curve.csv"
    rising = sorted(temps)
    path.write_text(HEADS + "".join(f"{temp}, {htc!r}\n" for temp in rising), encoding="utf-8")
    surface, found = read_curve(path)
    assert_allclose(surface, rising, rtol=0.0, atol=0.0)
    assert_allclose(found, np.full(len(rising), htc), rtol=0.0, atol=0.0)
