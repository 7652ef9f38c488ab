"""A link: one open conversation with one instrument.

It never delivers an old answer as a new one. After anything odd the link is dirty; before its next exchange it puts
a fence of a random number into the conversation (``*ESE n;*ESE?``, standard commands) and drops all that comes
before it. Where the fence does not come back, it closes, opens again and asks whether it is the same instrument.
A command that sets something is never sent twice by the link itself.
"""

from __future__ import annotations

import random
import re
import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any

from pyvisa import ResourceManager
from pyvisa.errors import Error as VisaError

from linetest.errors import InstrumentError, LinkError, LinkGarbled, LinkLost, LinkTimeout
from linetest.instruments.dialect import Dialect
from linetest.instruments.library import StationLibrary
from linetest.instruments.translate import translating

Tap = Callable[[float, str, str, str], None]
"""Called for every message: time (Unix, s), resource, ``>`` sent or ``<`` received, text."""

LARGEST_REPLY = 1 << 20
FENCE_LINES = 64
QUEUE_READS = 32
RESYNC_MS = 1000
INFINITE = 9.9e37  # SCPI-1999, volume 1, 7.2.1: infinity; not-a-number is 9.91e37, beyond it


class Link:
    """One open conversation with one instrument.

    Args:
        resource: VISA resource name.
        dialect: How it speaks.
        library: The VISA library to open it with.
        expected_identity: Regular expression its identity answer must match.
        tap: Told of every message.
        rng: Where fence numbers come from.
    """

    def __init__(
        self,
        resource: str,
        dialect: Dialect,
        library: StationLibrary,
        *,
        expected_identity: str = "",
        tap: Tap | None = None,
        rng: random.Random | None = None,
    ) -> None:
        self.resource = resource
        self.dialect = dialect
        self.reopened = 0
        self.discarded_bytes = 0
        self.identity = ""
        self._library = library
        self._manager = ResourceManager(library)
        self._expected = expected_identity
        self._tap = tap
        self._rng = rng or random.Random()  # noqa: S311  (a fence must differ from stale numbers, not resist attack)
        self._lock = threading.RLock()
        self._resource: Any = None
        self._dirty = False
        self._limit_ms = float("inf")

    def open(self) -> str:
        """Open the conversation and check who answers.

        Returns:
            The identity answer.

        Raises:
            LinkError: It cannot be reached, or another instrument answers.
        """
        with self._lock:
            self._open()
            return self.identity

    def close(self) -> None:
        """End the conversation; the next exchange would open it again."""
        with self._lock:
            resource, self._resource = self._resource, None
            if resource is not None:
                try:
                    resource.close()
                except Exception:  # noqa: BLE001  (a dead peer must not keep us from forgetting it)
                    self._dirty = True

    @contextmanager
    def hurried(self, limit_ms: int) -> Iterator[None]:
        """Cap every single wait for a while, so that what must be bounded in time is.

        Args:
            limit_ms: Longest wait for a connection, a write or an answer.

        Yields:
            Nothing.
        """
        with self._lock:
            before, self._limit_ms = self._limit_ms, float(limit_ms)
            try:
                yield
            finally:
                self._limit_ms = before

    def ask(self, text: str, *, timeout_ms: int | None = None) -> str:
        """Ask and return the answer, without its line end.

        Args:
            text: The query.
            timeout_ms: Longest wait for the whole answer; the dialect's where None.

        Returns:
            The answer.

        Raises:
            LinkError: No answer, a broken one, or the instrument reports an error.
        """
        with self._lock:
            self._ready()
            return self._asked(text, timeout_ms or self.dialect.timeout_ms)

    def tell(self, text: str, *, timeout_ms: int | None = None) -> None:
        """Say a command and read the error queue in the same message, so that an error has its cause.

        Args:
            text: The command.
            timeout_ms: Longest wait; the dialect's where None.

        Raises:
            LinkError: It could not be said, or the instrument reports an error.
        """
        with self._lock:
            self._ready()
            limit_ms = timeout_ms or self.dialect.timeout_ms
            if not self.dialect.errors:
                self._send(text, limit_ms)
                return
            answer = self._asked(f"{text};:{self.dialect.errors}", limit_ms, cause=text)
            reports = self._drain(first=answer)
            if reports:
                raise InstrumentError(self.resource, text, reports)

    def _open(self) -> None:
        self.close()
        with translating(self.resource):
            resource = self._manager.open_resource(
                self.resource, open_timeout=int(min(self.dialect.open_timeout_ms, self._limit_ms))
            )
            resource.write_termination = ""  # type: ignore[attr-defined]  # message-based resources have it
            resource.read_termination = "\n"  # type: ignore[attr-defined]  # terminators are bytes we send ourselves
            self._resource = resource
        self._dirty = False
        try:
            self._identify()
        except BaseException:
            # Left open, it would be used next time without anybody knowing who answers.
            self.close()
            raise

    def _identify(self) -> None:
        if not self.dialect.identify:
            return
        answer = self._exchange(self.dialect.identify, self.dialect.timeout_ms)
        if self._expected and not re.fullmatch(self._expected, answer):
            raise LinkLost(
                self.resource,
                self.dialect.identify,
                f"another instrument answers: {answer!r}, expected {self._expected!r}; check cables and station sheet",
            )
        self.identity = answer
        if self.dialect.clear_status:
            self._send(self.dialect.clear_status, self.dialect.timeout_ms)

    def _ready(self) -> None:
        if self._resource is None:
            self._reopen()
        try:
            stale = self._library.opened_session(self._resource.session).stale()
        except (OSError, VisaError):
            self._reopen()
            return
        if stale:
            self.discarded_bytes += len(stale)
            self._dirty = True
        if self._dirty:
            self._resync()

    def _reopen(self) -> None:
        self._open()
        self.reopened += 1

    def _resync(self) -> None:
        """Fence off what is still on its way; reopen where the fence does not come back."""
        if not self.dialect.fence:
            self._reopen()
            return
        try:
            with translating(self.resource):
                self._resource.clear()
            number = self._rng.randrange(2, 255)  # 0 and 1 are what a switch answers
            self._send(f"*ESE {number};*ESE?", RESYNC_MS)
            deadline_s = time.monotonic() + min(RESYNC_MS, self._limit_ms) / 1000.0
            for _ in range(FENCE_LINES):
                left_ms = (deadline_s - time.monotonic()) * 1000.0
                if left_ms <= 0:
                    break
                line = self._receive("*ESE?", left_ms)
                if line.strip() in {str(number), f"+{number}"}:
                    self._send("*ESE 0", RESYNC_MS)
                    self._dirty = False
                    return
                self.discarded_bytes += len(line)
        except (LinkTimeout, LinkLost, LinkGarbled):
            pass
        self._reopen()

    def _asked(self, text: str, timeout_ms: float, *, cause: str | None = None) -> str:
        try:
            return self._exchange(text, timeout_ms)
        except LinkTimeout:
            # Mostly a rejected command: after a command error IEEE 488.2 parsers drop the rest of the message.
            self._dirty = True
            reports = self._reports_after_silence()
            if reports:
                raise InstrumentError(self.resource, cause or text, reports) from None
            raise
        except LinkError:
            self._dirty = True
            raise

    def _reports_after_silence(self) -> list[tuple[int, str]]:
        if not self.dialect.errors or not self.dialect.fence:
            return []
        try:
            self._resync()
            return self._drain()
        except LinkError:
            self._dirty = True
            return []

    def _drain(self, first: str | None = None) -> list[tuple[int, str]]:
        """Empty the error queue; bounded, because a broken instrument may never say it is empty."""
        reports: list[tuple[int, str]] = []
        for _ in range(QUEUE_READS):
            answer = first if first is not None else self._exchange(self.dialect.errors, self.dialect.timeout_ms)
            first = None
            found = re.fullmatch(r'\s*([+-]?\d+)\s*,\s*"(.*)"\s*', answer)
            if found is None:
                self._dirty = True
                raise LinkGarbled(self.resource, self.dialect.errors, f"the error queue answered {answer[:60]!r}")
            if int(found[1]) == 0:
                break
            reports.append((int(found[1]), found[2]))
        return reports

    def _exchange(self, text: str, timeout_ms: float) -> str:
        try:
            self._send(text, timeout_ms)
            if self.dialect.query_delay_ms:
                time.sleep(self.dialect.query_delay_ms / 1000.0)
            return self._receive(text, timeout_ms)
        except BaseException:
            # Its answer may still be on its way, whatever ended the wait for it.
            self._dirty = True
            raise

    def _send(self, text: str, timeout_ms: float) -> None:
        self._note(">", text)
        with translating(self.resource, text):
            self._resource.timeout = min(timeout_ms, self._limit_ms)
            self._library.write(self._resource.session, text.encode(self.dialect.encoding) + b"\n")

    def _receive(self, text: str, timeout_ms: float) -> str:
        deadline_s = time.monotonic() + min(timeout_ms, self._limit_ms) / 1000.0
        reply = bytearray()
        while not reply.endswith(b"\n"):
            left_ms = (deadline_s - time.monotonic()) * 1000.0
            if left_ms <= 0:
                self._dirty = True
                raise LinkTimeout(self.resource, text, "the answer began but did not end in time")
            if len(reply) > LARGEST_REPLY:
                self._dirty = True
                raise LinkGarbled(self.resource, text, f"the answer has no end within {LARGEST_REPLY} bytes")
            with translating(self.resource, text):
                self._resource.timeout = max(1.0, left_ms)
                data, _ = self._library.read(self._resource.session, LARGEST_REPLY)
            reply += data
            if not data:
                break
        try:
            answer = reply.decode(self.dialect.encoding).rstrip("\r\n")
        except UnicodeDecodeError as reason:
            self._dirty = True
            raise LinkGarbled(self.resource, text, f"the answer is not text: {bytes(reply[:40])!r}") from reason
        self._note("<", answer)
        if not answer:
            self._dirty = True
            raise LinkGarbled(self.resource, text, "the answer is empty")
        return answer

    def mark_dirty(self) -> None:
        """What was understood from an answer makes no sense: fence before the next exchange."""
        self._dirty = True

    def _note(self, direction: str, text: str) -> None:
        if self._tap is not None:
            self._tap(time.time(), self.resource, direction, text)
