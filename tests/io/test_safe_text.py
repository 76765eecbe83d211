import unicodedata

import pytest
from hypothesis import given
from hypothesis import strategies as st

from unitclass.io.safe_text import safe_text


@pytest.mark.parametrize(("hostile", "shown"), [
    ("unit \x1b[31m7\x1b[0m", "unit 7"),                     # ECMA-48 8.3.117 SGR
    ("\x1b]0;new title\x07cell", "cell"),                    # control string ended by BEL
    ("\x1b]8;;file:///x\x1b\\link\x1b]8;;\x1b\\", "link"),   # ended by ST
    ("\x1bP1$r0m\x1b\\cell", "cell"),                        # ECMA-48 8.3.27 DCS
    ("\x9b2Jcell", "cell"), ("\x9dtitle\x9ccell", "cell"),   # the same in 8-bit form
    ("\x1bccell", "cell"), ("\x1b(0cell", "cell"),           # RIS; designate a character set
    ("a\x00b\x08c\x7f", "abc"),
    ("PNA\u202egnirts\u2066x\u200e", "PNAgnirtsx"),          # Unicode TR 9: overrides and isolates
    ("two\r\nlines\tand a tab", "two lines and a tab"),
    ("half \ud800", "half \ufffd"),
    (b"caf\xc3\xa9 \xff", "caf\u00e9 \ufffd"),
    (12.5, "12.5"),
])
def test_nothing_that_steers_a_terminal_survives(hostile, shown):
    assert safe_text(hostile) == shown


@pytest.mark.parametrize("plain", ["aug-E", "préBötzinger", "[red]x[/red]", "呼吸", "a  b", "{x}"])
def test_plain_text_of_any_script_stays_as_it_is(plain):
    assert safe_text(plain) == plain


@given(st.text(alphabet=st.characters(), max_size=40))
def test_any_text_becomes_one_printable_line_that_utf8_can_hold(text):
    shown = safe_text(text)
    shown.encode("utf-8")
    assert "\n" not in shown
    assert all(unicodedata.category(c) not in ("Cc", "Cs") for c in shown)
    assert safe_text(shown) == shown
