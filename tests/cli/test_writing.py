"""Files are written whole or not at all, and nothing but a file is put in a file's place."""

from __future__ import annotations

import os
import stat
import threading
from pathlib import Path

import pytest

from pathgate.cli.writing import write_whole


def test_a_file_is_made_with_the_folders_above_it(tmp_path):
    write_whole(tmp_path / "a/b/c.json", b"new")
    assert (tmp_path / "a/b/c.json").read_bytes() == b"new"
    assert [path.name for path in (tmp_path / "a/b").iterdir()] == ["c.json"]


def test_a_file_that_is_open_for_reading_keeps_what_it_had(tmp_path):
    path = tmp_path / "c.json"
    path.write_bytes(b"old")
    with path.open("rb") as reader:
        write_whole(path, b"new and longer")
        assert reader.read() == b"old"
    assert path.read_bytes() == b"new and longer"


def test_what_cannot_be_written_leaves_nothing_behind(tmp_path):
    (tmp_path / "c.json").mkdir()
    with pytest.raises(OSError, match="directory"):
        write_whole(tmp_path / "c.json", b"new")
    assert [path.name for path in tmp_path.iterdir()] == ["c.json"]


def test_a_link_stays_one_and_what_it_leads_to_is_written(tmp_path):
    (tmp_path / "real").mkdir()
    (tmp_path / "real/c.json").write_bytes(b"old")
    (tmp_path / "c.json").symlink_to(tmp_path / "real/c.json")
    write_whole(tmp_path / "c.json", b"new")
    assert (tmp_path / "c.json").is_symlink()
    assert (tmp_path / "real/c.json").read_bytes() == b"new"


def test_a_pipe_is_written_into_and_stays_one(tmp_path):
    path = tmp_path / "pipe"
    os.mkfifo(path)
    read: list[bytes] = []
    reader = threading.Thread(target=lambda: read.append(path.read_bytes()))
    reader.start()
    write_whole(path, b"new")
    reader.join(timeout=10)
    assert read == [b"new"]
    assert stat.S_ISFIFO(Path(path).stat().st_mode)
