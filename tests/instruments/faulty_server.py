"""A server on loopback that answers one instrument's queries, or misbehaves as instruments do."""

from __future__ import annotations

import contextlib
import re
import socket
import threading
import time
from types import TracebackType

NO_ERROR = '0,"No error"'
IDENTITY = "Brackwater Telemetry,AT-64,AT64-0031,1.0"
ANSWERS = {
    "": b"20.00\n",
    "hang": b"",
    "twice": b"20.00\n99.00\n",
    "half": b"20.",
    "garbage": b"\xff\xfe\x80\n",
    "words": b"hello\n",
    "blank": b"\n20.00\n",
    "not a number": b"9.91E37\n",
    "endless": b"7" * (3 << 20),
    "carriage return": b"20.00\r\n",
}


class FaultyServer:
    """Speaks like an attenuator; ``fault`` says how it misbehaves at the next ``INP:ATT?``."""

    def __init__(self) -> None:
        self.fault = ""
        self.identity = IDENTITY
        self.silent: set[str] = set()
        self.heard: list[str] = []
        self._listener = socket.create_server(("127.0.0.1", 0))
        self._open: list[socket.socket] = []
        threading.Thread(target=self._accept, daemon=True).start()

    @property
    def resource(self) -> str:
        return f"TCPIP0::127.0.0.1::{self._listener.getsockname()[1]}::SOCKET"

    def __enter__(self) -> FaultyServer:
        return self

    def __exit__(self, *_: type[BaseException] | BaseException | TracebackType | None) -> None:
        with contextlib.suppress(OSError):
            self._listener.shutdown(socket.SHUT_RDWR)
        self._listener.close()
        for connection in self._open:
            connection.close()

    def _accept(self) -> None:
        while True:
            try:
                connection, _ = self._listener.accept()
            except OSError:
                return
            self._open.append(connection)
            threading.Thread(target=self._serve, args=(connection,), daemon=True).start()

    def _serve(self, connection: socket.socket) -> None:
        queue: list[str] = []
        mask = "0"
        with contextlib.suppress(OSError):
            pending = b""
            while data := connection.recv(65536):
                *lines, pending = (pending + data).split(b"\n")
                for line in lines:
                    text = line.decode()
                    self.heard.append(text)
                    if fence := re.fullmatch(r"\*ESE (\d+);\*ESE\?", text):
                        mask = fence[1]
                        connection.sendall(f"{mask}\n".encode())
                    elif text in self.silent:
                        pass
                    elif text == "late reject;:SYST:ERR?":
                        connection.sendall(b'-222,"Data out of range"\n')
                        time.sleep(0.3)
                    elif text == "*IDN?":
                        connection.sendall(f"{self.identity}\n".encode())
                    elif text == "SYST:ERR?":
                        entry = queue.pop(0) if queue else NO_ERROR
                        connection.sendall(f"{entry}\n".encode())
                    elif text.startswith("BLAH"):
                        queue.append('-113,"Undefined header"')
                    elif text.endswith(";:SYST:ERR?") and self.fault == "killed at setting":
                        self.fault = ""
                        connection.shutdown(socket.SHUT_RDWR)
                    elif text.endswith(";:SYST:ERR?"):
                        connection.sendall(b'0,"No error"\n')
                    elif text == "INP:ATT?":
                        self._answer(connection)

    def _answer(self, connection: socket.socket) -> None:
        fault, self.fault = self.fault, ""
        match fault:
            case "killed":
                connection.shutdown(socket.SHUT_RDWR)
            case "late":
                time.sleep(0.4)
                connection.sendall(b"99.00\n")
            case "babble":
                while True:
                    connection.sendall(b"7" * (1 << 20))
            case _:
                connection.sendall(ANSWERS[fault])
