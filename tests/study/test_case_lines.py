"""The line scan: against ``tomllib`` on what is there, by hand on where."""

import tomllib
from time import perf_counter

import pytest
from hypothesis import given
from hypothesis import strategies as st

from midradius.study.caselines import KeyPath, line_of, locate

AWKWARD = '''title = "a # no remark"   # line 1
a.b."c d" = 1
long = """
[not.a.table]
x = 1
"""
list = [
  1,
  { x = "]", y = [2, 3] },   # }
  'raw \\',
]
[steel]
'quoted key' = true
date = 1979-05-27 07:32:00

[[route]]
stage = "soak"
[[route]]
stage = "quench"
faces = { "far face" = { medium = "still air" }, bore.bath = "20 degC" }
[[route.more]]
z = 1
[[route.more]]
z = """"quoted\\""""
[route.last.deep]
q = -inf
'''


@pytest.mark.parametrize(
    ("path", "line"),
    [
        (("title",), 1),
        (("a", "b", "c d"), 2),
        (("long",), 3),
        (("list",), 7),
        (("list", 0), 8),
        (("list", 1, "y", 1), 9),
        (("list", 2), 10),
        (("steel",), 12),
        (("steel", "quoted key"), 13),
        (("steel", "date"), 14),
        (("route",), 16),
        (("route", 0, "stage"), 17),
        (("route", 1), 18),
        (("route", 1, "faces", "far face", "medium"), 20),
        (("route", 1, "faces", "bore", "bath"), 20),
        (("route", 1, "more", 0, "z"), 22),
        (("route", 1, "more", 1, "z"), 24),
        (("route", 1, "last", "deep", "q"), 26),
        (("route", 1, "missing", "key"), 18),
    ],
)
def test_a_key_is_found_on_its_line(path: KeyPath, line: int) -> None:
    assert line_of(locate(AWKWARD), path) == line


def test_a_key_that_has_no_table_has_no_line() -> None:
    assert line_of(locate(AWKWARD), ("nowhere", "at all")) is None


def paths_of(value: object, place: KeyPath = ()) -> set[KeyPath]:
    found = {place} if place else set()
    if isinstance(value, dict):
        for name, item in value.items():
            found |= paths_of(item, (*place, name))
    elif isinstance(value, list):
        for number, item in enumerate(value):
            found |= paths_of(item, (*place, number))
    return found


def test_the_scan_finds_the_same_keys_as_the_parser() -> None:
    assert set(locate(AWKWARD)) == paths_of(tomllib.loads(AWKWARD))


scalars = st.one_of(
    st.integers(-(10**6), 10**6).map(str),
    st.sampled_from(["true", "inf", "1e3", "07:32:00", '"""\na]}#\n"""', "'''x''y\n'''"]),
    st.text("ab\"'#[]{}=,\\ \u00b0", max_size=6).map(
        lambda text: '"' + text.replace("\\", "\\\\").replace('"', '\\"') + '"'
    ),
    st.text('ab"#[]{}=,\\ ', max_size=6).map(lambda text: f"'{text}'"),
)
names = st.sampled_from(["a", "b-1", '"c d"', "'e#'", '"\\u0066]"'])


def array(items: list[str]) -> str:
    return "[" + ", # remark ]\n".join(items) + "\n]"


def inline(items: dict[str, str]) -> str:
    one_line = {name: value for name, value in items.items() if "\n" not in value}
    return "{ " + ", ".join(f"{name} = {value}" for name, value in one_line.items()) + " }"


values = st.recursive(
    scalars,
    lambda inner: st.one_of(
        st.lists(inner, max_size=3).map(array),
        st.dictionaries(names, inner, max_size=3).map(inline),
    ),
    max_leaves=8,
)
tables = st.dictionaries(names, values, max_size=4)


@given(top=tables, named=st.dictionaries(names, tables, max_size=3), many=st.lists(tables))
def test_the_scan_agrees_with_the_parser_on_generated_texts(
    top: dict[str, str], named: dict[str, dict[str, str]], many: list[dict[str, str]]
) -> None:
    def body(table: dict[str, str]) -> str:
        return "".join(f"{name} = {value} # = [\n" for name, value in table.items())

    text = body(top)
    text += "".join(f"\n[t.{name}]\n{body(table)}" for name, table in named.items())
    text += "".join(f"[[many]]\n{body(table)}" for table in many)
    assert set(locate(text)) == paths_of(tomllib.loads(text))


@given(st.text(max_size=60))
def test_the_scan_survives_what_is_not_toml(text: str) -> None:
    locate(text)


def test_the_scan_takes_time_in_proportion_to_the_text() -> None:
    def duration(n: int) -> float:
        text = '[[route]]\nstage = "quench"\nmedium = "still air"\n' * n
        times = []
        for _ in range(3):
            start = perf_counter()
            locate(text)
            times.append(perf_counter() - start)
        return min(times)

    short, long = duration(1_000), duration(10_000)
    assert long < 40.0 * short  # 10 in proportion, 100 if quadratic
