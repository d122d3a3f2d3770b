"""Lines of keys in a TOML text."""

import tomllib

from slabsim.stack.lines import key_lines
from tests.stack.texts import WINDOW

HARD = '''\
# a comment with [brackets] and "quotes
title = "a # in text, and \\" a quote" # [x]
long = """
[not.a.header]
key = 1 \\""" still text
"""
raw = \'\'\'
other = "2
\'\'\'
"quoted key" . 'and more'.plain = 1
[a."b.c"]
list = [ "x",
  # comment in a list ]
  { p = 1, q.r = [1, 2] }, # more
  """
  multi""",
]
date = 1979-05-27 07:32:00
inline = { x = { y = 'z' }, n = -1.5e3 }
[[group]]
v = 1
[[group.inner]]
w = 2
[[group.inner]]
w = 3
[group.inner.deep]
u = 4
[[group]]
v = 5
[[group.inner]]
w = 6
'''


def paths_of(value, path=()):
    """All key paths of a parsed text."""
    items = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    for key, inner in items:
        yield (*path, key)
        yield from paths_of(inner, (*path, key))


def test_every_key_of_a_hard_text_has_its_line():
    lines = key_lines(HARD)
    parsed = tomllib.loads(HARD)
    assert set(paths_of(parsed)) == set(lines)
    expected = {
        ("title",): 2,
        ("long",): 3,
        ("raw",): 7,
        ("quoted key", "and more", "plain"): 10,
        ("a", "b.c"): 11,
        ("a", "b.c", "list", 0): 12,
        ("a", "b.c", "list", 1, "q", "r", 1): 14,
        ("a", "b.c", "list", 2): 15,
        ("a", "b.c", "date"): 18,
        ("a", "b.c", "inline", "x", "y"): 19,
        ("group", 0, "inner", 1, "w"): 25,
        ("group", 0, "inner", 1, "deep", "u"): 27,
        ("group", 1, "v"): 29,
        ("group", 1, "inner", 0, "w"): 31,
    }
    assert {path: lines[path] for path in expected} == expected


def test_every_key_of_a_stack_file_has_the_line_it_stands_on():
    lines = key_lines(WINDOW)
    text = WINDOW.splitlines()
    assert set(paths_of(tomllib.loads(WINDOW))) == set(lines)
    for path, line in lines.items():
        names = [part for part in path if isinstance(part, str)]
        assert names[-1] in text[line - 1]


def test_line_ends_of_other_systems_count_alike():
    assert key_lines(HARD.replace("\n", "\r\n")) == key_lines(HARD)


def test_a_text_without_keys_has_no_lines():
    assert key_lines("") == key_lines("# nothing\n\n") == {}
