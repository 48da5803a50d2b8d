"""Design files as files: what is kept of them, and what is no design file at all."""

import hashlib
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchlog.circuit.nominal import nominal_figures
from benchlog.design.example import EXAMPLE_DESIGN
from benchlog.design.read import parse_design, read_design
from benchlog.errors import DesignFileError, ExitCode


@pytest.mark.parametrize(
    "content",
    [
        EXAMPLE_DESIGN.encode(),
        EXAMPLE_DESIGN.replace("\n", "\r\n").encode(),
        b"\xef\xbb\xbf" + EXAMPLE_DESIGN.encode(),
    ],
    ids=["plain", "with carriage returns", "with a byte order mark"],
)
def test_text_and_hash_are_those_of_the_file(tmp_path: Path, content: bytes) -> None:
    """The text gives the file's bytes back, and the hash is over them."""
    path = tmp_path / "preamp.toml"
    path.write_bytes(content)

    design = read_design(path)

    assert design.name == "line preamp"
    assert design.text.encode() == content
    assert design.sha256 == hashlib.sha256(content).hexdigest()
    assert parse_design(design.text, where="logbook") == design
    assert read_design(str(path)) == design


@pytest.mark.parametrize(
    ("text", "where", "what", "expected"),
    [
        ("[[stage]]", "stage[1].topology", "stage[1].topology is missing", "one of: follower, "),
        ("stage = [3]", "stage[1]", "stage[1] is a whole number: 3", "a table with the keys "),
        ("stage = []", "stage", "stage is an empty list", "a [[stage]] table for each"),
        ("amplifier = 3", "amplifier", "the amplifier has no name", "a table for each amplifier"),
        ("budget = 3", "budget", "budget is a whole number: 3", "a table with the keys rule, "),
        ("", "name", "name is missing", "a text, for example"),
    ],
)
def test_tables_that_are_none(text: str, where: str, what: str, expected: str) -> None:
    """What stands where a table belongs; a comment alone lacks everything."""
    with pytest.raises(DesignFileError) as refused:
        parse_design(f"# a comment\n{text}", where="test.toml")
    assert refused.value.where == f"test.toml: {where}"
    assert refused.value.what == what
    assert (refused.value.expected or "").startswith(expected)


@pytest.mark.parametrize(
    ("content", "what", "where"),
    [
        (b"", "the file is empty", ""),
        (b"\xef\xbb\xbf \r\n", "the file is empty", ""),
        (b"# only a comment", "name is missing", ": name"),
        (b'name = "x', "the file is not TOML: Unterminated string (at end of document)", ""),
        (b"a = " + b"[" * 5000, "the file is not TOML: nested too deeply", ""),
        (b"name,gain\n1,2", None, ""),
        (b"PK\x03\x04\x00", None, ""),
        (b"a = " + b"9" * 5000, None, ""),
        (b'name = "caf\xe9"', "the file is not UTF-8 text: byte 0xe9 in line 1", ": line 1"),
        (b"a = 1\n\nb = '\xff\xfe'", "the file is not UTF-8 text: byte 0xff in line 3", ": line 3"),
        (b"#" * 1_000_001, "the file is too large for a design file", ""),
    ],
    ids=range(11),
)
def test_what_is_no_design_file(
    tmp_path: Path, content: bytes, what: str | None, where: str
) -> None:
    """One error with the file's name, and the line where there is one."""
    path = tmp_path / "preamp.toml"
    path.write_bytes(content)

    with pytest.raises(DesignFileError) as refused:
        read_design(path)

    assert refused.value.where == f"{path}{where}"
    assert refused.value.expected
    assert refused.value.exit_code == ExitCode.NOT_DONE
    if what is None:
        assert refused.value.what.startswith("the file is not TOML: ")
    else:
        assert refused.value.what == what


def test_a_missing_file_and_a_folder(tmp_path: Path) -> None:
    """What the system says, and how to get a file to start from."""
    for path in (tmp_path, tmp_path / "missing.toml", "nul\0byte.toml"):
        with pytest.raises(DesignFileError, match="the design file cannot be read: ") as refused:
            read_design(path)
        assert refused.value.where == str(path)
        assert refused.value.hint == "`benchlog new DIR` makes one to start from"


entries = (
    st.sampled_from(
        ["47k", "4k7", "22p", "1 MHz", "20 mVpp", "10 dB", "1%", "13 V/us", "5 V", "x", "", "0"]
    ).map(lambda text: f'"{text}"')
    | st.integers(min_value=-(10**6), max_value=10**20).map(str)
    | st.floats(allow_nan=False, allow_infinity=False).map(repr)
    | st.sampled_from(["true", "nan", "-inf", "[]", "{}", "[1, 2]", "2027-03-31", '{ min = "1" }'])
)
lines = st.sampled_from(
    [line for line in EXAMPLE_DESIGN.splitlines() if "=" in line and not line.startswith("#")]
)


@settings(max_examples=60, deadline=None)
@given(line=lines, entry=entries, key=st.none() | st.text(alphabet="abgmnx_", min_size=1))
def test_any_change_of_a_line_is_a_design_or_one_error(
    line: str, entry: str, key: str | None
) -> None:
    """Nothing else is ever raised, and what is read has figures of its own."""
    changed = f"{key or line.partition(' =')[0]} = {entry}"
    try:
        design = parse_design(EXAMPLE_DESIGN.replace(line, changed), where="preamp.toml")
    except DesignFileError:
        return
    assert nominal_figures(design.chain()).gain > 0


@settings(max_examples=40, deadline=None)
@given(text=st.text(max_size=60))
def test_any_text_is_refused_with_one_error(text: str) -> None:
    """A design needs more than sixty characters."""
    with pytest.raises(DesignFileError):
        parse_design(text, where="noise")
