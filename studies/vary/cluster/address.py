"""The address of a scheduler and the files for TLS: what is wrong with them, told before anything is started."""

from __future__ import annotations

import socket
import ssl
import urllib.parse
from contextlib import suppress
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from geometry.problem import Problem, SpecError
from studies.vary.run.backend import BackendLost

CONNECT = 5.0
"""Seconds that a scheduler's machine may take to accept a connection, and again to agree on TLS."""

ALLOWED = "tcp://HOST:PORT or tls://HOST:PORT of a scheduler"


@dataclass(frozen=True, slots=True)
class Tls:
    """Files for TLS in PEM form; an empty name leaves it to Dask's own configuration.

    Attributes
    ----------
    ca
        Certificates of those who may sign: the scheduler's certificate must be signed by one of them.
    cert, key
        This side's certificate and its private key (which may be in the file of the certificate).
    """

    ca: str = ""
    cert: str = ""
    key: str = ""

    def __bool__(self) -> bool:
        return bool(self.ca or self.cert or self.key)


@dataclass(frozen=True, slots=True)
class Address:
    """Where a scheduler is: ``tcp://HOST:PORT`` or ``tls://HOST:PORT``."""

    scheme: str
    host: str
    port: int

    def __str__(self) -> str:
        return f"{self.scheme}://{f'[{self.host}]' if ':' in self.host else self.host}:{self.port}"


def read_address(text: str, tls: Tls) -> Address:
    """Read an address. Raises SpecError with every mistake in it and in the files for TLS."""
    address, problems = None, []
    try:
        parts = urllib.parse.urlsplit(text)
        if parts.scheme in ("tcp", "tls") and parts.hostname and parts.port and not (parts.path.strip("/") or
                                                                                    parts.query or parts.username):
            address = Address(parts.scheme, parts.hostname, parts.port)
    except ValueError:  # no number, or a bad one, where the port should be
        pass
    if address is None:
        problems.append(Problem("--on", text, ALLOWED, "The scheduler prints its address when it starts."))
    for name, file in (("--tls-ca", tls.ca), ("--tls-cert", tls.cert), ("--tls-key", tls.key)):
        if file and not Path(file).is_file():
            problems.append(Problem(name, file, "a PEM file that can be read"))
    if tls and not (tls.ca and tls.cert):
        missing = " and ".join(name for name, file in (("--tls-ca", tls.ca), ("--tls-cert", tls.cert)) if not file)
        problems.append(Problem("--tls-ca, --tls-cert", "one without the other", "both, or neither",
                                f"Give {missing} too: each side shows its certificate to the other."))
    if tls and address is not None and address.scheme != "tls":
        problems.append(Problem("--on", text, "tls://HOST:PORT where files for TLS are given",
                                f"Write tls://{text.partition('://')[2]}."))
    if problems:
        raise SpecError(problems)
    assert address is not None
    return address


def context_of(tls: Tls, security: Any) -> ssl.SSLContext:
    """The TLS context of a client, from Dask's `security`. Raises `BackendLost` where the files are no use, or there
    are none."""
    try:
        context: ssl.SSLContext | None = security.get_connection_args("client").get("ssl_context")
    except (OSError, ValueError) as error:  # ssl.SSLError is an OSError
        files = ", ".join(filter(None, (tls.ca, tls.cert, tls.key))) or "that Dask's configuration names"
        raise BackendLost(f"the files for TLS ({files}) cannot be used: {_plain(error)}. All are in PEM form, and the "
                          "key must be that of the certificate") from error
    if context is None:
        raise BackendLost("a scheduler at tls://... wants certificates: give --tls-ca, --tls-cert and --tls-key, or "
                          "name them in Dask's configuration (distributed.comm.tls)")
    return context


def knock(address: Address, context: ssl.SSLContext | None) -> None:
    """See that something listens at the address and that both sides agree on TLS. Raises `BackendLost`."""
    try:
        with socket.create_connection((address.host, address.port), CONNECT) as line:
            if context is None:
                return
            with context.wrap_socket(line, server_hostname=address.host) as secure:
                secure.settimeout(0.5)
                with suppress(TimeoutError):  # it says nothing, so it has not refused our certificate
                    secure.recv(1)
    except socket.gaierror as error:
        raise BackendLost(f"no machine of the name {address.host!r} is known here: look at --on {address}") from error
    except TimeoutError as error:
        raise BackendLost(f"no answer from {address} within {CONNECT:g} s: is it the right machine and port, and does "
                          "a firewall let it through?") from error
    except ConnectionRefusedError as error:
        raise BackendLost(f"nothing listens at {address} (connection refused): is the scheduler running there? It "
                          "prints its address when it starts") from error
    except ssl.SSLError as error:
        raise BackendLost(f"{address} answers, but the two sides do not agree on TLS: {_tls_words(error)}") from error
    except OSError as error:
        raise BackendLost(f"{address} cannot be reached: {_plain(error)}") from error


def _tls_words(error: ssl.SSLError) -> str:
    text = str(error).upper().replace("_", " ")
    if isinstance(error, ssl.SSLCertVerificationError):
        return (f"its certificate is not signed by one of --tls-ca, or is out of date ({error.verify_message}). Take "
                "the files with which the scheduler was started")
    if "UNKNOWN CA" in text or "CERTIFICATE" in text:
        return ("it does not accept the certificate of --tls-cert. Take one that is signed by what the scheduler was "
                "given as its --tls-ca-file")
    if "WRONG VERSION NUMBER" in text or "RECORD LAYER" in text or "EOF" in text:
        return "it does not speak TLS. Was the scheduler started without? Then write tcp:// here"
    return _plain(error)


def _plain(error: BaseException) -> str:
    text = getattr(error, "strerror", None) or str(error) or type(error).__name__
    return str(text).partition(" (_ssl.c")[0]
