"""The bench over real sockets: each instrument on a port of its own, a thread for each connection.

It listens on loopback only; nothing here is meant for a network.
"""

from __future__ import annotations

import contextlib
import socket
import threading
from collections.abc import Mapping

from linetest.bench.scpi import Instrument
from linetest.bench.station import Bench

LOOPBACK = "127.0.0.1"
CHUNK = 65536


class _Port:
    """One instrument's listening socket and its connections."""

    def __init__(self, instrument: Instrument) -> None:
        self._instrument = instrument
        self._connections: set[socket.socket] = set()
        self._guard = threading.Lock()
        self._listener = socket.create_server((LOOPBACK, 0))
        self.number: int = self._listener.getsockname()[1]
        threading.Thread(target=self._accept, daemon=True).start()

    def _accept(self) -> None:
        while True:
            try:
                connection, _ = self._listener.accept()
            except OSError:
                return
            with self._guard:
                self._connections.add(connection)
            threading.Thread(target=self._serve, args=(connection,), daemon=True).start()

    def _serve(self, connection: socket.socket) -> None:
        connection.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
        conversation = self._instrument.connect()
        try:
            # One program message at a time, its answer at once: a raw socket has no other sign that one waits.
            pending = b""
            while data := connection.recv(CHUNK):
                *lines, pending = (pending + data).split(b"\n")
                for line in lines:
                    conversation.feed(line + b"\n")
                    while conversation.pending():
                        connection.sendall(conversation.take(CHUNK)[0])
        except OSError:
            pass  # the controller went away, or a planted fault drops the connection
        finally:
            with self._guard:
                self._connections.discard(connection)
            connection.close()

    def close(self) -> None:
        # Shutting down wakes the thread that accepts; closing alone would not.
        with contextlib.suppress(OSError):
            self._listener.shutdown(socket.SHUT_RDWR)
        self._listener.close()
        with self._guard:
            for connection in self._connections:
                with contextlib.suppress(OSError):
                    connection.shutdown(socket.SHUT_RDWR)


class ServedBench:
    """A bench being served. Made by :func:`serve`.

    Attributes:
        resources: VISA resource name by role.
    """

    def __init__(self, bench: Bench) -> None:
        self._ports = {role: _Port(device) for role, device in bench.devices.items()}
        self.resources: Mapping[str, str] = {
            role: f"TCPIP0::{LOOPBACK}::{port.number}::SOCKET" for role, port in self._ports.items()
        }

    def close(self) -> None:
        """Stop serving and drop every connection."""
        for port in self._ports.values():
            port.close()


def serve(bench: Bench) -> ServedBench:
    """Serve every instrument of a bench on a loopback port of its own.

    Args:
        bench: The bench.

    Returns:
        The served bench.
    """
    return ServedBench(bench)
