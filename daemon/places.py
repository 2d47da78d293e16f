"""Where files live: the default history, and file systems that neither lock nor announce changes."""

from __future__ import annotations

import os
import sys
from pathlib import Path

# File systems served over a network, by the type names that Linux lists in /proc/mounts (common practice).
# `fuse.*` names come with the program that serves them.
_NETWORK_TYPES = frozenset(
    {
        "nfs",
        "nfs3",
        "nfs4",
        "cifs",
        "smb",
        "smb2",
        "smb3",
        "smbfs",
        "ncpfs",
        "afs",
        "afpfs",
        "webdav",
        "davfs",
        "davfs2",
        "9p",
        "ceph",
        "glusterfs",
        "lustre",
        "gfs2",
        "ocfs2",
        "beegfs",
        "fuse.sshfs",
        "fuse.davfs2",
        "fuse.rclone",
        "fuse.glusterfs",
        "fuse.s3fs",
        "fuse.smbnetfs",
        "fuse.ceph",
        "vboxsf",
        "prl_fs",
    }
)
_MOUNTS = Path("/proc/mounts")
_DRIVE_REMOTE = 4  # GetDriveTypeW, winbase.h


def default_history() -> Path:
    """`history.sqlite` in the user's data folder for reactance."""
    import platformdirs

    return Path(platformdirs.user_data_dir("reactance", appauthor=False)) / "history.sqlite"


def board_file(path: Path | str) -> str:
    """The name under which the history knows an export: its absolute path, links resolved."""
    return str(Path(path).resolve())


def network_file_system(path: Path, mounts: Path = _MOUNTS) -> str | None:
    """The type of the network file system that holds `path`, or None.

    Linux lists its mounts; Windows tells a drive's type. Elsewhere it is unknown, and None.
    """
    where = _existing(path.resolve())
    if sys.platform == "win32":
        return _windows_network(where)
    try:
        lines = mounts.read_text(encoding="utf-8", errors="surrogateescape").splitlines()
    except OSError:
        return None
    best, kind = "", None
    for line in lines:
        fields = line.split()
        if len(fields) < 3:
            continue
        point = fields[1].replace("\\040", " ").replace("\\011", "\t").replace("\\134", "\\")
        # >=: the last mount on a point hides earlier ones
        if _holds(point, str(where)) and len(point) >= len(best):
            best, kind = point, fields[2]
    return kind if kind in _NETWORK_TYPES else None


def _holds(point: str, path: str) -> bool:
    return point in ("/", path) or path.startswith(point.rstrip("/") + "/")


def _existing(path: Path) -> Path:
    for candidate in (path, *path.parents):
        if candidate.exists():
            return candidate
    return path


def _windows_network(path: Path) -> str | None:
    if sys.platform != "win32":
        return None
    import ctypes

    if str(path).startswith("\\\\"):
        return "network share"
    root = os.path.splitdrive(path)[0] + "\\"
    return "network drive" if ctypes.windll.kernel32.GetDriveTypeW(root) == _DRIVE_REMOTE else None
