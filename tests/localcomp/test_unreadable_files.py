"""Files that are no TOML file at all: missing, empty, binary, directories, too large, not to be read."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from localcomp.calibrate import read_liquid
from localcomp.errors import BadInput
from localcomp.inputs import read_state
from localcomp.tables import LARGEST_FILE
from tests.localcomp.state_files import STATE

CONTENTS = {
    "empty": (b"", "is empty"),
    "blank": (b" \n\t\n", "is empty"),
    "binary": (bytes(range(256)) * 4, "not a text file"),
    "null bytes": (b"\x00" * 100, "not valid TOML"),
    "utf-16": (STATE.encode("utf-16"), "not a text file"),
    "latin-1": (STATE.replace("small", "klein\xe9").encode("latin-1"), "not a text file"),
    "not toml": (b"temperature: 2.0\n", "not valid TOML"),
    "comments only": (b"# nothing here\n", "[mixture]"),
    "half a line": (STATE.encode()[:30], "not valid TOML"),
    "same key twice": (STATE.encode() + b"accuracy = 1e-5\n", "not valid TOML"),
    "nested too deep": (b"x = " + 3000 * b"[" + 3000 * b"]", "not valid TOML"),
    "too many digits": (b"x = " + 5000 * b"9", "not valid TOML"),
    "too large": (b"# " + LARGEST_FILE * b"x", "is larger than"),
}

READERS = {"state": read_state, "calibrate": read_liquid}


@pytest.mark.parametrize("command", READERS)
@pytest.mark.parametrize("case", CONTENTS)
def test_contents_that_cannot_be_used(case, command, tmp_path, run):
    content, words = CONTENTS[case]
    words = words.replace("mixture", "fluid") if command == "calibrate" else words
    path = tmp_path / "file.toml"
    path.write_bytes(content)
    with pytest.raises(BadInput) as caught:
        READERS[command](path)
    assert str(path) in str(caught.value)
    assert words in str(caught.value)
    ran = run(command, path)
    assert (ran.status, ran.out) == (2, "")
    assert str(path) in ran.err
    assert words in ran.err
    assert "Traceback" not in ran.err


@pytest.mark.parametrize("command", READERS)
def test_paths_that_cannot_be_read(command, tmp_path, write, run):
    write(STATE, "state.toml")
    paths = {
        tmp_path / "stat.toml": 'no such file; did you mean "state.toml"?',
        tmp_path / "nowhere" / "x.toml": "no such file",
        tmp_path: "is a directory",
        tmp_path / "state.toml" / "x": "cannot be read",
        tmp_path / (300 * "x"): "cannot be read",
        Path("with\0zero"): "cannot be read",
    }
    for path, words in paths.items():
        with pytest.raises(BadInput) as caught:
            READERS[command](path)
        assert words in str(caught.value)
        assert str(path) in str(caught.value)
        if "\0" not in str(path):
            ran = run(command, path)
            assert (ran.status, ran.out) == (2, "")
            assert words in ran.err


def test_a_file_without_permission(write, monkeypatch):
    def refuse(*_args, **_keywords):
        raise PermissionError(13, "Permission denied")

    path = write(STATE)
    monkeypatch.setattr(Path, "open", refuse)
    with pytest.raises(BadInput, match=r"cannot be read \(Permission denied\)"):
        read_state(path)


@pytest.mark.skipif(not os.path.exists("/dev/zero"), reason="no such device here")
def test_a_device_without_end_is_read_to_the_limit_only():
    with pytest.raises(BadInput, match="is larger than"):
        read_state("/dev/zero")


def test_windows_line_ends_and_byte_order_mark_are_fine(tmp_path):
    path = tmp_path / "state.toml"
    path.write_bytes(b"\xef\xbb\xbf" + STATE.replace("\n", "\r\n").encode())
    assert read_state(path).closure == "rhnc"
