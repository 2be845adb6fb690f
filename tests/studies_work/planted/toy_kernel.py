"""A template's module without a kernel: its job waits, or eats memory, until it is ended."""

import tempfile
import time


def prepare() -> None:
    """Nothing to load."""


def serve(order, data) -> int:
    hoard = []
    with tempfile.NamedTemporaryFile(dir=order["folder"], prefix="kernel-"):
        while not order.get("done"):
            if order.get("hog"):
                hoard.append(bytearray(b"x") * (4 * 2**20))
            time.sleep(0.005)
    return 0
