"""Messages between the host and a job, on the job's data socket: a length and JSON."""

from __future__ import annotations

import json
import socket
from collections.abc import Iterator
from typing import Any

_HEAD = 8


def send(data: socket.socket, message: Any) -> None:
    """Send one message."""
    content = json.dumps(message).encode()
    data.sendall(len(content).to_bytes(_HEAD, "big") + content)


def receive(data: socket.socket) -> Any:
    """Wait for one message. Raises EOFError where the other side has gone."""
    return json.loads(_read(data, int.from_bytes(_read(data, _HEAD), "big")))


def _read(data: socket.socket, size: int) -> bytes:
    held = bytearray()
    while len(held) < size:
        piece = data.recv(size - len(held))
        if not piece:
            raise EOFError
        held += piece
    return bytes(held)


class Inbox:
    """Messages out of the pieces in which they arrive."""

    def __init__(self) -> None:
        self._held = bytearray()

    def take(self, piece: bytes) -> Iterator[Any]:
        """Add a piece; the messages that are now whole."""
        self._held += piece
        while len(self._held) >= _HEAD:
            end = _HEAD + int.from_bytes(self._held[:_HEAD], "big")
            if len(self._held) < end:
                return
            message = json.loads(bytes(self._held[_HEAD:end]))
            del self._held[:end]
            yield message
