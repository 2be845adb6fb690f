"""Where a record may lie: on a disk of this machine."""

from __future__ import annotations

import os
import re
from pathlib import Path

from studies.record.errors import RecordError

MOUNTS = Path("/proc/self/mountinfo")

NETWORK = {
    "nfs", "nfs4", "cifs", "smb", "smb2", "smb3", "smbfs", "afs", "ncpfs", "coda", "9p", "ceph", "lustre", "gpfs",
    "glusterfs", "beegfs", "pvfs2", "orangefs", "ocfs2", "gfs", "gfs2", "panfs", "vboxsf", "vmhgfs", "prl_fs", "drvfs",
    "davfs", "sshfs", "rclone", "s3fs", "gcsfuse", "juicefs", "moosefs", "seaweedfs", "ceph-fuse", "vmhgfs-fuse",
    "davfs2", "gvfsd-fuse", "grpcfuse", "curlftpfs", "cephfs", "osxfs", "weka", "wekafs", "quobyte", "acfs",
}
"""Kinds of file system that several machines share (those of FUSE without their ``fuse.``); common knowledge."""


def kind_of(path: Path, mounts: str | None = None) -> str:
    """Kind of the file system that holds `path`, as the system names it: ``ext4``, ``nfs4``, ``fuse.sshfs``.

    `mounts` is the content of ``/proc/self/mountinfo`` (see proc(5)); empty text where the system has none.
    """
    if mounts is None:
        try:
            mounts = MOUNTS.read_text(encoding="utf-8", errors="surrogateescape")
        except OSError:
            mounts = ""
    place, best, kind = os.path.realpath(path), "", ""
    for line in mounts.splitlines():
        before, _, after = line.partition(" - ")
        fields, kinds = before.split(" "), after.split(" ")
        if len(fields) < 5 or not kinds[0]:
            continue
        point = re.sub(r"\\([0-7]{3})", lambda m: chr(int(m[1], 8)), fields[4])
        inside = place == point or place.startswith(point.rstrip("/") + "/")
        if inside and len(point) >= len(best):  # of two mounted on one point the later one hides the other
            best, kind = point, kinds[0]
    return kind


def is_network(kind: str) -> bool:
    """Is a file system of this kind shared by several machines?"""
    return kind.removeprefix("fuse.") in NETWORK


def refuse_network(path: Path, mounts: str | None = None) -> None:
    """Raise `RecordError` when `path` lies on a network drive."""
    kind = kind_of(path, mounts)
    if is_network(kind):
        raise RecordError(
            f"the record {path} would lie on a network drive ({kind}), which is refused: the record's locks and the "
            "memory that its readers share do not reach from one machine to another there, so that finished variants "
            "could be lost.\n"
            f"  1. keep it on a disk of this machine: --record /var/tmp/{path.name}\n"
            "  2. for the others, export the finished table to the network drive: haunch export RECORD FILE.csv")


def refuse_folder(path: Path) -> None:
    """Raise `RecordError` when `path` has no folder to lie in, or is one itself."""
    if path.is_dir():
        raise RecordError(f"{path} is a folder, not a record: give --record a file")
    if not path.parent.is_dir():
        raise RecordError(f"the folder {path.parent} for the record does not exist: make it, or choose another "
                          "--record")


def refuse_unwritable(path: Path) -> None:
    """Raise `RecordError` when the record `path` or its folder may not be written."""
    if not os.access(path.parent, os.W_OK | os.X_OK):
        raise RecordError(f"the folder {path.parent} may not be written in, and a record needs files beside it: make "
                          "the folder writable, or copy the record elsewhere and give --record")
    if path.exists() and not os.access(path, os.W_OK):
        raise RecordError(f"the record {path} may not be written (read-only): chmod u+w {path}, or copy it elsewhere "
                          "and give --record")
