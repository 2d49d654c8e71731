"""The line of a key is right, or not given."""

from __future__ import annotations

import tomllib

from hypothesis import given
from hypothesis import strategies as st

from pacing.race.lines import key_lines, line_of

TRICKY = '''\
# a comment with [header] and key = 1
top = "a # b = c"   # 2
"quoted key" = 'x = "'
[a]            # 4
b.c = """
[not.a.header]
d = 1
"""            # 5 to 8
e = [          # 9
  # f = 1
  "]", { g = 1 },
]
'h i' = { j = 1, k = "}" }
[[l]]          # 14
m = 1
[[l]]          # 16
m = \'\'\'
m = 2\'\'\'
[l.n]          # 19
o = 1
[[l.p]]
q = 1
'''


def test_headers_strings_and_lists_do_not_lead_the_scan_astray() -> None:
    tomllib.loads(TRICKY)
    assert key_lines(TRICKY) == {
        ("top",): 2,
        ("quoted key",): 3,
        ("a",): 4,
        ("a", "b", "c"): 5,
        ("a", "e"): 9,
        ("a", "h i"): 13,
        ("l", 0): 14,
        ("l", 0, "m"): 15,
        ("l", 1): 16,
        ("l", 1, "m"): 17,
        ("l", 1, "n"): 19,
        ("l", 1, "n", "o"): 20,
        ("l", 1, "p", 0): 21,
        ("l", 1, "p", 0, "q"): 22,
    }


def test_a_key_inside_a_value_has_the_line_of_what_holds_it() -> None:
    lines = key_lines(TRICKY)
    assert line_of(lines, ("a", "e", 1, "g")) == 9
    assert line_of(lines, ("nowhere",)) is None


names = st.text("ab-_1", min_size=1, max_size=3)
values = st.sampled_from(
    ["1", '"#"', "'['", '"""x\n[a]\n"""', "'''\n''y'''", "[1,\n2]", '{ z = "\\"" }', '""', "0x1F"]
)
gaps = st.sampled_from(["", "\n", "# [x]\n", "  \n\t", "#\n\n"])


@given(
    st.lists(st.tuples(gaps, names, values, st.booleans()), max_size=12, unique_by=lambda t: t[1])
)
def test_every_outer_key_of_any_text_is_found_on_its_line(
    entries: list[tuple[str, str, str, bool]],
) -> None:
    text, table = "", ()
    expected: dict[tuple[str, ...], int] = {}
    for gap, name, value, is_header in entries:
        text += gap
        line = text.count("\n") + 1
        if is_header:
            table = (f"t{name}",)
            text += f"[t{name}]  # = \n"
            expected[table] = line
        else:
            text += f" {name} = {value} # x\n"
            expected[(*table, name)] = line
    tomllib.loads(text)
    assert key_lines(text) == expected
