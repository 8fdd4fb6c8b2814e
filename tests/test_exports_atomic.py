"""Files appear complete or not at all, and trouble is told before the work starts."""

from __future__ import annotations

import errno
import os
import stat
import threading
from pathlib import Path
from typing import Any

import pytest

from bem.errors import InputError, UsageError
from bem.exports.atomic import check_target, write_file


def fail_with(number: int) -> Any:
    def fail(*_: Any, **__: Any) -> None:
        raise OSError(number, os.strerror(number))

    return fail


def watched(monkeypatch: pytest.MonkeyPatch, *names: str) -> list[tuple[str, Any]]:
    """Let calls of ``os`` functions through, and list them with their arguments."""
    calls: list[tuple[str, Any]] = []

    def watch(name: str, original: Any) -> Any:
        def call(*arguments: Any) -> Any:
            calls.append((name, arguments))
            return original(*arguments)

        return call

    for name in names:
        monkeypatch.setattr(os, name, watch(name, getattr(os, name)))
    return calls


def names_in(folder: Path) -> list[str]:
    return sorted(entry.name for entry in folder.iterdir())


def test_writes_and_replaces(tmp_path: Path) -> None:
    target = tmp_path / "r.json"
    for data in (b"first, longer", b"second"):
        write_file(target, data)
        assert target.read_bytes() == data
    assert names_in(tmp_path) == ["r.json"]


@pytest.mark.parametrize("step", ["fsync", "replace"])
def test_a_failure_on_the_way_leaves_the_old_file_and_no_rest(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, step: str
) -> None:
    target = tmp_path / "r.json"
    target.write_bytes(b"old")
    monkeypatch.setattr(os, step, fail_with(errno.ENOSPC))
    with pytest.raises(InputError, match="r.json': No space left on device; what was there"):
        write_file(target, b"new")
    assert target.read_bytes() == b"old"
    assert names_in(tmp_path) == ["r.json"]


def test_an_interrupt_on_the_way_leaves_no_rest(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def interrupted(_: int) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(os, "fsync", interrupted)
    with pytest.raises(KeyboardInterrupt):
        write_file(tmp_path / "r.json", b"new")
    assert names_in(tmp_path) == []


def test_the_bytes_are_on_disk_before_the_name_changes(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    calls = watched(monkeypatch, "fsync", "replace")
    write_file(tmp_path / "r.json", b"new")
    assert [name for name, _ in calls][:2] == ["fsync", "replace"]


def test_the_scratch_file_is_in_the_same_folder(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    calls = watched(monkeypatch, "replace")
    write_file(tmp_path / "r.json", b"new")
    scratch = Path(calls[0][1][0])
    assert scratch.parent == tmp_path and scratch.name != "r.json"


def test_permissions_of_the_old_file_are_kept_and_a_new_one_follows_the_mask(
    tmp_path: Path,
) -> None:
    old, new = tmp_path / "old", tmp_path / "new"
    old.write_bytes(b"")
    old.chmod(0o604)
    mask = os.umask(0o027)
    try:
        write_file(old, b"x")
        write_file(new, b"x")
    finally:
        os.umask(mask)
    assert stat.S_IMODE(old.stat().st_mode) == 0o604
    assert stat.S_IMODE(new.stat().st_mode) == 0o640


def test_a_link_stays_a_link(tmp_path: Path) -> None:
    (tmp_path / "link").symlink_to(tmp_path / "real")
    write_file(tmp_path / "link", b"x")
    assert (tmp_path / "link").is_symlink()
    assert (tmp_path / "real").read_bytes() == b"x"


def test_a_pipe_is_written_and_stays_a_pipe(tmp_path: Path) -> None:
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    received: list[bytes] = []
    reader = threading.Thread(target=lambda: received.append(pipe.read_bytes()))
    reader.start()
    check_target(pipe)
    write_file(pipe, b"through")
    reader.join(timeout=5)
    assert received == [b"through"] and pipe.is_fifo()


def test_the_door_lets_good_targets_pass_and_leaves_no_trace(tmp_path: Path) -> None:
    check_target(tmp_path / "new.json")
    assert names_in(tmp_path) == []
    (tmp_path / "old.json").write_bytes(b"old")
    check_target(tmp_path / "old.json")
    assert (tmp_path / "old.json").read_bytes() == b"old"


def refusal(target: Path | str) -> str:
    with pytest.raises(UsageError) as caught:
        check_target(target)
    return str(caught.value)


def test_the_door_names_a_folder_that_is_missing(tmp_path: Path) -> None:
    message = refusal(tmp_path / "gone" / "r.json")
    assert f"there is no folder {tmp_path / 'gone'}; create it" in message


def test_the_door_refuses_a_folder(tmp_path: Path) -> None:
    assert "it is a folder; give the name of a file" in refusal(tmp_path)


def test_the_door_refuses_a_name_that_is_too_long(tmp_path: Path) -> None:
    assert "File name too long" in refusal(tmp_path / ("x" * 300))


def test_the_door_refuses_a_name_with_a_null(tmp_path: Path) -> None:
    assert "null" in refusal(f"{tmp_path}/x\0y")


def test_the_door_notices_a_read_only_folder(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(os, "open", fail_with(errno.EROFS))
    assert "Read-only file system; choose another file" in refusal(tmp_path / "r.json")


def test_the_door_notices_a_read_only_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "r.json").write_bytes(b"")
    monkeypatch.setattr(os, "access", lambda *_: False)
    assert "the file is read-only" in refusal(tmp_path / "r.json")
