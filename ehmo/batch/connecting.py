"""Connections to schedulers: on the loopback interface, or encrypted."""

from __future__ import annotations

import contextlib
import ipaddress
import logging
from dataclasses import dataclass
from pathlib import Path
from typing import Any
from urllib.parse import urlsplit

from ehmo.batch.cluster import ClusterEngine
from ehmo.errors import BatchError, InputError
from ehmo.structure.files import shown

CONNECT_LIMIT_S = 20.0

INSTALL = "pip install 'ehmo[cluster]'"


@dataclass(frozen=True, slots=True)
class TlsFiles:
    """Files of a TLS connection, all PEM: certificate of the authority, own certificate, own key."""

    authority: str
    certificate: str
    key: str


def connected_engine(
    address: str,
    tls: TlsFiles | None = None,
    *,
    time_limit_s: float | None = None,
    memory_limit: int | None = None,
) -> ClusterEngine:
    """Engine on a scheduler that is running.

    Parameters
    ----------
    address : str
        ``tls://host:port``, or ``tcp://`` on the loopback interface: who reaches a scheduler without TLS can run
        any program in its name.
    tls : TlsFiles, optional
        Needed for ``tls://``.
    time_limit_s, memory_limit
        As for `ClusterEngine`.

    Returns
    -------
    engine : ClusterEngine

    Raises
    ------
    InputError
        If the address is none, or leads off this machine without TLS.
    BatchError
        If dask is not installed, or no scheduler answers there.
    """
    checked_address(address, tls)
    try:
        from distributed import Client, Security
    except ImportError:
        raise BatchError("dask is not installed", place="--scheduler", mend=INSTALL) from None
    security: Any = None
    if tls is not None:
        security = Security(
            require_encryption=True,
            tls_ca_file=tls.authority,
            tls_client_cert=tls.certificate,
            tls_client_key=tls.key,
        )
    try:
        client = Client(address, security=security, timeout=CONNECT_LIMIT_S, set_as_default=False)
    except (OSError, TimeoutError, ValueError, RuntimeError) as fault:
        raise BatchError(
            f"no scheduler answers ({shown(fault, 120)})",
            place=shown(address, 100),
            mend="start it, or check address and certificates",
        ) from None
    return ClusterEngine(client, time_limit_s=time_limit_s, memory_limit=memory_limit)


def quiet_logs() -> None:
    """Leave it to errors to say what is wrong: dask would write tracebacks beside them."""
    with contextlib.suppress(ImportError):
        import distributed  # noqa: F401  its loggers are there once it is loaded

    for name in logging.root.manager.loggerDict:
        if name.split(".")[0] in ("distributed", "dask_jobqueue", "bokeh", "tornado"):
            logging.getLogger(name).setLevel(logging.CRITICAL + 1)


def checked_address(address: str, tls: TlsFiles | None) -> None:
    """Refuse an address that is none or that is not safe.

    Raises
    ------
    InputError
        If so.
    """
    place = shown(address, 100)
    try:
        parts = urlsplit(address)
        usable = parts.scheme in ("tcp", "tls") and parts.hostname and parts.port and not parts.path.strip("/")
    except ValueError:
        usable = False
    if not usable:
        raise InputError("no address of a scheduler", place=place, mend="write tls://host:8786 or tcp://127.0.0.1:8786")
    if parts.scheme == "tcp" and not _is_loopback(str(parts.hostname)):
        raise InputError(
            "a scheduler without TLS on another machine runs whatever anyone sends it",
            place=place,
            mend="start it with TLS and use tls://",
        )
    if (parts.scheme == "tls") != (tls is not None):
        raise InputError(
            "tls:// needs certificates, and only tls:// takes them",
            place=place,
            mend="give --tls-ca, --tls-cert and --tls-key",
        )
    for path in () if tls is None else (tls.authority, tls.certificate, tls.key):
        if not Path(path).is_file():
            raise InputError("no such file", place=shown(path, 200), mend="check the path of the certificate or key")


def _is_loopback(host: str) -> bool:
    if host == "localhost":
        return True
    try:
        return ipaddress.ip_address(host).is_loopback
    except ValueError:
        return False
