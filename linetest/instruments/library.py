"""The VISA library that linetest gives to PyVISA.

It routes by resource name: a simulated resource is answered in process; a ``TCPIP::…::SOCKET`` resource goes to
our own socket session; anything else goes to an installed VISA, when there is one. PyVISA keeps one library object
for each (class, path), so every library made here has a path of its own.
"""

from __future__ import annotations

import itertools
import threading
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from typing import Any, Protocol, cast

from pyvisa import constants, errors, rname
from pyvisa.constants import ResourceAttribute, StatusCode
from pyvisa.highlevel import VisaLibraryBase
from pyvisa.util import LibraryPath

from linetest.instruments.sessions import Conversation, InProcessSession, Session, SocketSession

_numbers = itertools.count(1)


class Cancel(threading.Event):
    """Ends every wait of every session once set, except inside :meth:`shielded`."""

    def __init__(self) -> None:
        super().__init__()
        self._shields = 0

    def is_set(self) -> bool:
        """Whether waits are to end now."""
        return not self._shields and super().is_set()

    @contextmanager
    def shielded(self) -> Iterator[None]:
        """For what must not be cut short, such as switching off; a cancel that comes meanwhile holds afterwards.

        Yields:
            Nothing.
        """
        self._shields += 1
        try:
            yield
        finally:
            self._shields -= 1


class SimulatedDevice(Protocol):
    """A simulated instrument that can be talked to."""

    def connect(self) -> Conversation:
        """Begin a conversation with a parser and an output queue of its own."""


class StationLibrary(VisaLibraryBase):
    """Routes each resource to where it is answered. Made by :meth:`create`."""

    sessions: dict[int, Any]
    cancel: Cancel
    _devices: dict[str, SimulatedDevice]
    _handles: itertools.count[int]
    _fallback_name: str | None
    _fallback: Any

    @classmethod
    def create(
        cls, simulated: Mapping[str, SimulatedDevice] | None = None, *, fallback: str | None = "@py"
    ) -> StationLibrary:
        """A library with a cancel event and resources of its own.

        Args:
            simulated: Devices answered in process, by VISA resource name.
            fallback: PyVISA's name of the library for resources that are neither simulated nor raw sockets, or None.

        Returns:
            The library, to be given to ``pyvisa.ResourceManager``.
        """
        library = cls(LibraryPath(f"linetest-{next(_numbers)}", "station"))
        library.sessions = {}
        library.cancel = Cancel()
        library._devices = {_canonical(name): device for name, device in (simulated or {}).items()}
        library._handles = itertools.count(1)
        library._fallback_name = fallback
        library._fallback = None
        return library

    def _init(self) -> None:
        """PyVISA's hook after construction: there is nothing to load."""

    @staticmethod
    def get_library_paths() -> tuple[LibraryPath, ...]:
        """No file stands behind this library."""
        return (LibraryPath("linetest", "station"),)

    def open_default_resource_manager(self) -> tuple[Any, StatusCode]:
        """Session of the resource manager.

        Returns:
            Its handle and the status.
        """
        handle = next(self._handles)
        self.sessions[handle] = self
        return handle, self.handle_return_value(cast("Any", handle), StatusCode.success)

    def list_resources(self, session: Any, query: str = "?*::INSTR") -> tuple[str, ...]:  # noqa: ARG002
        """Names of the simulated resources; discovery on networks is slow and never complete.

        Args:
            session: Session of the resource manager.
            query: PyVISA's filter.

        Returns:
            The names that match.
        """
        return rname.filter(self._devices, query)

    def open(
        self,
        session: Any,  # noqa: ARG002
        resource_name: str,
        access_mode: constants.AccessModes = constants.AccessModes.no_lock,
        open_timeout: int = constants.VI_TMO_IMMEDIATE,
    ) -> tuple[Any, StatusCode]:
        """Open a resource.

        Args:
            session: Session of the resource manager.
            resource_name: VISA resource name.
            access_mode: VISA lock wanted; locking is the station's own business.
            open_timeout: Longest wait in ms; 0 means the default of 3 s.

        Returns:
            Handle of the new session and the status.
        """
        try:
            parsed = rname.parse_resource_name(resource_name)
        except rname.InvalidResourceName:
            return 0, self.handle_return_value(None, StatusCode.error_invalid_resource_name)
        opened: Session
        device = self._devices.get(str(parsed))
        if device is not None:
            opened = InProcessSession(parsed, device.connect(), self.cancel)
        elif (parsed.interface_type, parsed.resource_class) == ("TCPIP", "SOCKET"):
            try:
                opened = SocketSession(parsed, (open_timeout or 3000) / 1000.0, self.cancel)
            except (OSError, OverflowError):
                return 0, self.handle_return_value(None, StatusCode.error_resource_not_found)
        else:
            return self._open_elsewhere(resource_name, access_mode, open_timeout)
        handle = next(self._handles)
        self.sessions[handle] = opened
        return handle, self.handle_return_value(cast("Any", handle), StatusCode.success)

    def _open_elsewhere(
        self, resource_name: str, access_mode: constants.AccessModes, open_timeout: int
    ) -> tuple[Any, StatusCode]:
        if self._fallback_name is None:
            return 0, self.handle_return_value(None, StatusCode.error_library_not_found)
        if self._fallback is None:
            from pyvisa import ResourceManager

            try:
                self._fallback = ResourceManager(self._fallback_name)
            except (ValueError, OSError, ImportError):
                return 0, self.handle_return_value(None, StatusCode.error_library_not_found)
        manager = self._fallback
        theirs, _ = manager.visalib.open(manager.session, resource_name, access_mode, open_timeout or 3000)
        handle = next(self._handles)
        self.sessions[handle] = _Elsewhere(manager.visalib, theirs)
        return handle, self.handle_return_value(cast("Any", handle), StatusCode.success)

    def close(self, session: Any) -> StatusCode:
        """Close a session and forget it.

        Args:
            session: Its handle.

        Returns:
            The status.
        """
        opened = self.sessions.pop(session, None) if session is not None else None
        if opened is not None and opened is not self:
            opened.close()
        for kept in (self._last_status_in_session, self._ignore_warning_in_session):
            kept.pop(session, None)
        return StatusCode.success

    def read(self, session: Any, count: int) -> tuple[bytes, StatusCode]:
        """Read up to a number of bytes.

        Args:
            session: Handle.
            count: Most bytes wanted.

        Returns:
            The bytes and the status.
        """
        data, status = self._opened(session).read(count)
        if status == StatusCode.success_max_count_read:
            # More is to come: the caller's business, and no reason for PyVISA to warn.
            return data, status
        return data, self.handle_return_value(session, status)

    def write(self, session: Any, data: bytes) -> tuple[int, StatusCode]:
        """Write bytes.

        Args:
            session: Handle.
            data: The bytes.

        Returns:
            How many were written, and the status.
        """
        written, status = self._opened(session).write(data)
        return written, self.handle_return_value(session, status)

    def clear(self, session: Any) -> StatusCode:
        """Drop what is pending in a session.

        Args:
            session: Handle.

        Returns:
            The status.
        """
        return self.handle_return_value(session, self._opened(session).clear())

    def get_attribute(self, session: Any, attribute: Any) -> tuple[Any, StatusCode]:
        """Read a VISA attribute.

        Args:
            session: Handle.
            attribute: The attribute.

        Returns:
            Its value and the status.
        """
        value, status = self._opened(session).get_attribute(attribute)
        return value, self.handle_return_value(session, status)

    def set_attribute(self, session: Any, attribute: Any, attribute_state: Any) -> StatusCode:
        """Set a VISA attribute.

        Args:
            session: Handle.
            attribute: The attribute.
            attribute_state: The value.

        Returns:
            The status.
        """
        return self.handle_return_value(session, self._opened(session).set_attribute(attribute, attribute_state))

    def disable_event(self, session: Any, event_type: Any, mechanism: Any) -> StatusCode:  # noqa: ARG002
        """Nothing to disable; PyVISA calls this at every close.

        Args:
            session: Handle.
            event_type: VISA event.
            mechanism: VISA mechanism.

        Returns:
            Success.
        """
        return StatusCode.success

    def discard_events(self, session: Any, event_type: Any, mechanism: Any) -> StatusCode:  # noqa: ARG002
        """Nothing to discard; PyVISA calls this at every close.

        Args:
            session: Handle.
            event_type: VISA event.
            mechanism: VISA mechanism.

        Returns:
            Success.
        """
        return StatusCode.success

    def opened_session(self, session: Any) -> Session:
        """The session behind a handle, for the link that wants to see stale bytes.

        Args:
            session: Handle.

        Returns:
            The session.
        """
        return self._opened(session)

    def _opened(self, session: Any) -> Session:
        opened = self.sessions.get(session)
        if opened is None or opened is self:
            raise errors.InvalidSession
        return opened  # type: ignore[no-any-return]  # the manager's own session was refused above


class _Elsewhere:
    """A session of another VISA library, under one of our handles."""

    def __init__(self, library: VisaLibraryBase, handle: Any) -> None:
        self._library = library
        self._handle = handle

    def read(self, count: int) -> tuple[bytes, StatusCode]:
        return self._library.read(self._handle, count)

    def write(self, data: bytes) -> tuple[int, StatusCode]:
        return self._library.write(self._handle, data)

    def clear(self) -> StatusCode:
        return self._library.clear(self._handle)

    def stale(self) -> bytes:
        return b""

    def get_attribute(self, attribute: ResourceAttribute) -> tuple[Any, StatusCode]:
        return self._library.get_attribute(self._handle, attribute)

    def set_attribute(self, attribute: ResourceAttribute, state: Any) -> StatusCode:
        return self._library.set_attribute(self._handle, attribute, state)

    def close(self) -> None:
        self._library.close(self._handle)


def _canonical(name: str) -> str:
    return str(rname.parse_resource_name(name))
