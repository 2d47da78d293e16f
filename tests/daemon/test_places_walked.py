"""Which files count: ignore patterns, temporary files, roots, network file systems."""

from __future__ import annotations

from pathlib import Path

import pytest
from daemonkit import small_export

from reactance.daemon.ignore import IGNORE_FILE, ignored, is_temporary
from reactance.daemon.places import network_file_system
from reactance.daemon.reading import is_export
from reactance.daemon.walk import roots_of


def make(folder: Path, *names: str) -> None:
    """Empty files of these names."""
    for name in names:
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.touch()


@pytest.mark.parametrize(
    "name",
    [".board.edn.swp", "board.edn~", "#board.edn#", "~$board.edn", "board.tmp", "BOARD.TMP", "board.edn.bak", ".git"],
)
def test_what_editors_leave_is_temporary(name: str) -> None:
    assert is_temporary(name)


@pytest.mark.parametrize("name", ["board.edn", "a.b.c.edn", "netlist", "board.pins.csv", "temp.edn"])
def test_ordinary_names_are_not(name: str) -> None:
    assert not is_temporary(name)


@pytest.mark.parametrize(
    ("pattern", "path", "out"),
    [
        ("*.edf", "a.edf", True),
        ("*.edf", "sub/a.edf", True),
        ("*.edf", "a.edn", False),
        ("/a.edn", "a.edn", True),
        ("/a.edn", "sub/a.edn", False),
        ("sub/*.edn", "sub/a.edn", True),
        ("sub/*.edn", "a.edn", False),
        ("old/", "old/a.edn", True),
        ("old/", "old", False),
        ("old", "deep/old/er/a.edn", True),
        ("# a.edn", "a.edn", False),
        ("*.edn\n!a.edn", "a.edn", False),
        ("*.edn\n!a.edn", "b.edn", True),
        ("\n  \n", "a.edn", False),
    ],
)
def test_ignore_patterns(tmp_path: Path, pattern: str, path: str, out: bool) -> None:
    make(tmp_path, path)
    (tmp_path / IGNORE_FILE).write_text(pattern, encoding="utf-8")
    assert ignored(tmp_path / path, tmp_path) is out


def test_ignore_files_count_from_where_they_stand(tmp_path: Path) -> None:
    make(tmp_path, "a/x.edn", "b/x.edn")
    (tmp_path / "a" / IGNORE_FILE).write_text("x.edn", encoding="utf-8")
    assert ignored(tmp_path / "a" / "x.edn", tmp_path)
    assert not ignored(tmp_path / "b" / "x.edn", tmp_path)


def test_a_changed_ignore_file_counts_at_once(tmp_path: Path) -> None:
    make(tmp_path, "x.edn")
    rules = tmp_path / IGNORE_FILE
    rules.write_text("y.edn", encoding="utf-8")
    assert not ignored(tmp_path / "x.edn", tmp_path)
    rules.write_text("x.edn # now", encoding="utf-8")
    rules.write_text("x.edn\ny.edn", encoding="utf-8")
    assert ignored(tmp_path / "x.edn", tmp_path)


def test_folders_are_walked_to_any_depth_and_pruned(tmp_path: Path) -> None:
    make(tmp_path, "a.edn", "x/y/z/b.edn", ".hidden/c.edn", "out/d.edn", "a.edn.bak")
    (tmp_path / IGNORE_FILE).write_text("out/", encoding="utf-8")
    (root,) = roots_of([tmp_path])
    found = [path.relative_to(root.folder).as_posix() for path in root.below(root.folder)]
    assert found == ["a.edn", "x/y/z/b.edn"]


def test_a_file_is_watched_through_its_folder_and_alone(tmp_path: Path) -> None:
    make(tmp_path, "a.edn", "b.edn")
    (root,) = roots_of([tmp_path / "a.edn"])
    assert (root.folder, root.deep) == (tmp_path.resolve(), False)
    assert root.holds(tmp_path.resolve() / "a.edn")
    assert not root.holds(tmp_path.resolve() / "b.edn")


def test_places_inside_one_another_are_watched_once(tmp_path: Path) -> None:
    make(tmp_path, "sub/a.edn")
    roots = roots_of([tmp_path, tmp_path / "sub", tmp_path])
    assert [root.folder for root in roots] == [tmp_path.resolve()]


def test_content_decides_what_is_an_export(tmp_path: Path) -> None:
    (tmp_path / "netlist.anything").write_bytes(small_export())
    (tmp_path / "notes.edn").write_bytes(b"meet on Friday")
    (tmp_path / "board.parts.csv").write_bytes(b"refdes,pin,net\nC1,1,GND\n")
    assert is_export(tmp_path / "netlist.anything")
    assert not is_export(tmp_path / "notes.edn")
    assert not is_export(tmp_path / "board.parts.csv")
    assert not is_export(tmp_path), "a folder"
    assert not is_export(tmp_path / "absent.edn")


MOUNTS = """\
/dev/sda1 / ext4 rw 0 0
server:/home /home nfs4 rw 0 0
/dev/sdb1 /home/local ext4 rw 0 0
//nas/team /mnt/team\\040share cifs rw 0 0
me@far: /srv/far fuse.sshfs rw 0 0
/dev/sdc1 /srv/far/mounted\\040over xfs rw 0 0
"""


@pytest.mark.parametrize(
    ("path", "kind"),
    [
        ("/etc/x", None),
        ("/home/me/x", "nfs4"),
        ("/home/local/x", None),
        ("/homes/x", None),
        ("/mnt/team share/board.edn", "cifs"),
        ("/srv/far/x", "fuse.sshfs"),
    ],
)
def test_network_file_systems_by_the_list_of_mounts(
    tmp_path: Path, path: str, kind: str | None, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(Path, "exists", lambda self: True)
    monkeypatch.setattr(Path, "resolve", lambda self: self)
    monkeypatch.setattr("sys.platform", "linux")
    mounts = tmp_path / "mounts"
    mounts.write_text(MOUNTS, encoding="utf-8")
    assert network_file_system(Path(path), mounts) == kind
