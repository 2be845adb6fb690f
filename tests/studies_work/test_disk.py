"""A disk that is really full: a small file system of the test's own, in a mount namespace of its own."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest
from work_helpers import PLANTED

pytestmark = pytest.mark.heavy

_CODE = """
import os, sys
sys.path[:0] = [{planted!r}]
from work_helpers import bar, order_of
from studies.vary.work import Ended, Host
filler = os.path.join(os.environ["TMPDIR"], "filler")
with Host(1) as host:
    order = order_of(1, bar())
    print(host.evaluate(order).status)
    with open(filler, "wb", buffering=0) as file:
        try:
            while file.write(b"x" * 4096):
                pass
        except OSError:
            pass
    print(host.evaluate(order))
    os.remove(filler)
    print(host.evaluate(order).status)
"""


def _can_mount(folder: Path) -> bool:
    if shutil.which("unshare") is None:
        return False
    tried = subprocess.run(["unshare", "-m", "mount", "-t", "tmpfs", "-o", "size=1m", "tmpfs", str(folder)],
                           capture_output=True, timeout=30)
    return tried.returncode == 0


def test_a_full_disk_ends_the_variant_and_room_on_it_lets_it_finish(tmp_path: Path) -> None:
    if not _can_mount(tmp_path):
        pytest.skip("no file system can be mounted here")
    mount = 'mount -t tmpfs -o size=8m tmpfs "$1" && TMPDIR="$1" exec "$2" -c "$3"'
    code = _CODE.format(planted=str(PLANTED))
    done = subprocess.run(["unshare", "-m", "sh", "-c", mount, "sh", str(tmp_path), sys.executable, code],
                          capture_output=True, text=True, timeout=300, env=dict(os.environ))
    assert done.stdout.splitlines() == [
        "finished", "Ended(key='key-1', signal='disk full', what='the temporary files')", "finished"], done.stderr
