"""Sessions behind the VISA library: in process, and over a raw socket.

The socket session exists because the usual one never notices a dead peer, can block for ever in ``clear`` and in a
write, opens refused ports without an error, stalls 40 ms on a write followed by a query, and hands a late answer to
the next question.
"""

from __future__ import annotations

import select
import socket
import threading
import time
from typing import Any, Protocol

from pyvisa import constants
from pyvisa.constants import ResourceAttribute, StatusCode

SLICE_S = 0.05
CLEAR_S = 0.02
CHUNK = 1 << 18


class Conversation(Protocol):
    """One conversation with a simulated instrument."""

    def feed(self, data: bytes) -> None:
        """Take bytes from the controller."""

    def pending(self) -> bool:
        """Whether an answer waits."""

    def take(self, limit: int) -> tuple[bytes, bool]:
        """Up to ``limit`` bytes of the answer, and whether it ends there."""

    def close(self) -> None:
        """End the conversation."""


class Session(Protocol):
    """What the library needs of a session."""

    def read(self, count: int) -> tuple[bytes, StatusCode]:
        """Read up to ``count`` bytes."""

    def write(self, data: bytes) -> tuple[int, StatusCode]:
        """Write all bytes or say why not."""

    def clear(self) -> StatusCode:
        """Drop what is pending, in bounded time."""

    def stale(self) -> bytes:
        """Bytes that arrived although nobody asked; raises OSError where the peer is gone."""

    def get_attribute(self, attribute: ResourceAttribute) -> tuple[Any, StatusCode]:
        """Read a VISA attribute."""

    def set_attribute(self, attribute: ResourceAttribute, state: Any) -> StatusCode:
        """Set a VISA attribute."""

    def close(self) -> None:
        """Close it."""


class _Attributes:
    """The VISA attributes that PyVISA itself reads and sets."""

    def __init__(self, parsed: Any) -> None:
        self.timeout_ms = 2000
        self.attributes: dict[Any, Any] = {
            ResourceAttribute.resource_name: str(parsed),
            ResourceAttribute.resource_class: parsed.resource_class,
            ResourceAttribute.interface_type: parsed.interface_type_const,
            ResourceAttribute.termchar: 0x0A,
            ResourceAttribute.termchar_enabled: constants.VI_FALSE,
            ResourceAttribute.send_end_enabled: constants.VI_TRUE,
            ResourceAttribute.suppress_end_enabled: constants.VI_FALSE,
        }

    def get_attribute(self, attribute: ResourceAttribute) -> tuple[Any, StatusCode]:
        """Read a VISA attribute."""
        if attribute == ResourceAttribute.timeout_value:
            return self.timeout_ms, StatusCode.success
        if attribute in self.attributes:
            return self.attributes[attribute], StatusCode.success
        return None, StatusCode.error_nonsupported_attribute

    def set_attribute(self, attribute: ResourceAttribute, state: Any) -> StatusCode:
        """Set a VISA attribute."""
        if attribute == ResourceAttribute.timeout_value:
            self.timeout_ms = state
        else:
            self.attributes[attribute] = state
        return StatusCode.success

    def _deadline_s(self) -> float:
        return time.monotonic() + self.timeout_ms / 1000.0


class InProcessSession(_Attributes):
    """A session with a simulated instrument in this process.

    Where no answer waits, a read times out at once: virtual time costs nothing.
    """

    def __init__(self, parsed: Any, conversation: Conversation, cancel: threading.Event) -> None:
        super().__init__(parsed)
        self._conversation = conversation
        self._cancel = cancel

    def read(self, count: int) -> tuple[bytes, StatusCode]:
        """Read up to ``count`` bytes."""
        if self._cancel.is_set():
            return b"", StatusCode.error_abort
        try:
            if not self._conversation.pending():
                return b"", StatusCode.error_timeout
            data, end = self._conversation.take(count)
        except ConnectionError:
            return b"", StatusCode.error_connection_lost
        if end:
            return data, StatusCode.success_termination_character_read
        return data, StatusCode.success_max_count_read

    def write(self, data: bytes) -> tuple[int, StatusCode]:
        """Write all bytes or say why not."""
        if self._cancel.is_set():
            return 0, StatusCode.error_abort
        try:
            self._conversation.feed(data)
        except ConnectionError:
            return 0, StatusCode.error_connection_lost
        return len(data), StatusCode.success

    def clear(self) -> StatusCode:
        """Drop what is pending."""
        while self._conversation.pending():
            self._conversation.take(CHUNK)
        return StatusCode.success

    def stale(self) -> bytes:
        """Bytes that wait although nobody asked."""
        found = b""
        while self._conversation.pending():
            found += self._conversation.take(CHUNK)[0]
        return found

    def close(self) -> None:
        """End the conversation."""
        self._conversation.close()


class SocketSession(_Attributes):
    """A raw TCP socket with a deadline on everything.

    Args:
        parsed: The resource name, parsed.
        open_timeout_s: Longest wait for the connection, s.
        cancel: Set from any thread to end a wait within one slice.

    Raises:
        OSError: The peer refuses, cannot be resolved or does not answer in time.
    """

    def __init__(self, parsed: Any, open_timeout_s: float, cancel: threading.Event) -> None:
        super().__init__(parsed)
        self._cancel = cancel
        self._buffer = bytearray()
        self._socket = socket.create_connection((parsed.host_address, int(parsed.port)), timeout=open_timeout_s)
        self._socket.setblocking(False)
        # Nagle would hold the query of a write-then-query back until the write is acknowledged: 40 ms.
        self._socket.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
        self._socket.setsockopt(socket.SOL_SOCKET, socket.SO_KEEPALIVE, 1)
        if hasattr(socket, "TCP_USER_TIMEOUT"):
            # A pulled cable sends no FIN: unacknowledged data must not wait for the system's quarter of an hour.
            self._socket.setsockopt(socket.IPPROTO_TCP, socket.TCP_USER_TIMEOUT, 5000)

    def _wait(self, *, to_write: bool, deadline_s: float) -> StatusCode:
        while True:
            if self._cancel.is_set():
                return StatusCode.error_abort
            left_s = min(SLICE_S, deadline_s - time.monotonic())
            if left_s <= 0:
                return StatusCode.error_timeout
            mine = [self._socket]
            readable, writable, _ = select.select([] if to_write else mine, mine if to_write else [], [], left_s)
            if readable or writable:
                return StatusCode.success

    def read(self, count: int) -> tuple[bytes, StatusCode]:
        """Read up to ``count`` bytes; what came of an answer that is not whole stays in the buffer."""
        deadline_s, seen = self._deadline_s(), 0
        ends = bool(self.attributes[ResourceAttribute.termchar_enabled])
        terminator = self.attributes[ResourceAttribute.termchar]
        while True:
            cut = self._buffer.find(terminator, seen) + 1 if ends else 0
            if 0 < cut <= count:
                return self._taken(cut), StatusCode.success_termination_character_read
            if len(self._buffer) >= count:
                return self._taken(count), StatusCode.success_max_count_read
            seen = len(self._buffer)
            try:
                data = self._socket.recv(CHUNK)
            except BlockingIOError:
                status = self._wait(to_write=False, deadline_s=deadline_s)
                if status < 0:
                    return b"", status
                continue
            except OSError:
                return b"", StatusCode.error_connection_lost
            if not data:
                return b"", StatusCode.error_connection_lost
            self._buffer += data

    def _taken(self, count: int) -> bytes:
        taken = bytes(self._buffer[:count])
        del self._buffer[:count]
        return taken

    def write(self, data: bytes) -> tuple[int, StatusCode]:
        """Write all bytes or say why not, within the timeout."""
        deadline_s, sent = self._deadline_s(), 0
        view = memoryview(data)
        while sent < len(data):
            if self._cancel.is_set():
                return sent, StatusCode.error_abort
            try:
                sent += self._socket.send(view[sent:])
            except BlockingIOError:
                status = self._wait(to_write=True, deadline_s=deadline_s)
                if status < 0:
                    return sent, status
            except OSError:
                return sent, StatusCode.error_connection_lost
        return sent, StatusCode.success

    def clear(self) -> StatusCode:
        """Drop what is pending, in bounded time."""
        self._buffer.clear()
        deadline_s = time.monotonic() + CLEAR_S
        while time.monotonic() < deadline_s:
            ready, _, _ = select.select([self._socket], [], [], max(0.0, deadline_s - time.monotonic()))
            if not ready:
                break
            try:
                if not self._socket.recv(CHUNK):
                    return StatusCode.error_connection_lost
            except BlockingIOError:
                break
            except OSError:
                return StatusCode.error_connection_lost
        return StatusCode.success

    def stale(self) -> bytes:
        """Bytes that arrived although nobody asked.

        Returns:
            The bytes, as a rule none.

        Raises:
            OSError: The peer closed the connection, it broke, or the peer does not stop talking.
        """
        found = bytes(self._buffer)
        self._buffer.clear()
        deadline_s = time.monotonic() + CLEAR_S
        while time.monotonic() < deadline_s:
            try:
                data = self._socket.recv(CHUNK)
            except BlockingIOError:
                return found
            if not data:
                raise ConnectionResetError
            found += data
        raise ConnectionAbortedError

    def close(self) -> None:
        """Close the socket."""
        self._socket.close()
