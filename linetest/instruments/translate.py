"""Foreign exceptions become ours, here and nowhere else.

A test holds this map against every error status that VISA defines, so that none reaches a technician raw.
"""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager

from pyvisa import errors
from pyvisa.constants import StatusCode

from linetest.errors import LinkAborted, LinkError, LinkGarbled, LinkLost, LinkTimeout

TIMEOUTS = {StatusCode.error_timeout}
ABORTS = {StatusCode.error_abort}
GARBLED = {
    StatusCode.error_raw_write_protocol_violation,
    StatusCode.error_raw_read_protocol_violation,
    StatusCode.error_output_protocol_violation,
    StatusCode.error_input_protocol_violation,
    StatusCode.error_serial_parity,
    StatusCode.error_serial_framing,
    StatusCode.error_serial_overrun,
}
_ADVICE = {
    StatusCode.error_resource_not_found: "nothing answers there; check that it is on, its cable, address and port",
    StatusCode.error_connection_lost: "the connection is gone; check that it is on and its cable",
    StatusCode.error_library_not_found: "no VISA for this kind of resource is installed; "
    "install linetest with 'network-visa', or the maker's VISA",
    StatusCode.error_invalid_resource_name: "this is not a VISA resource name; correct the station sheet",
    StatusCode.error_resource_locked: "another program holds it; close that program",
    StatusCode.error_resource_busy: "another program holds it; close that program",
}

# What the libraries below raise without turning it into a VISA status (measured: see the tests of this map).
FOREIGN = (
    errors.Error,
    OSError,
    EOFError,
    UnicodeDecodeError,
    NotImplementedError,
    RuntimeError,
    AssertionError,
    TypeError,
    ValueError,
)


def translated(reason: BaseException, resource: str, command: str) -> LinkError:
    """Our error for a foreign one.

    Args:
        reason: What was raised below.
        resource: VISA resource name.
        command: What was being said, empty where nothing was.

    Returns:
        The error to raise from it.
    """
    if isinstance(reason, errors.VisaIOError):
        try:
            status = StatusCode(reason.error_code)
        except ValueError:  # makers' libraries have numbers of their own
            return LinkLost(resource, command, f"VISA says {reason.error_code}")
        return _of_status(status, resource, command)
    if isinstance(reason, UnicodeDecodeError):
        return LinkGarbled(resource, command, f"the answer is not text: {bytes(reason.object)[:40]!r}")
    if isinstance(reason, TimeoutError):
        return LinkTimeout(resource, command, "no answer in time")
    return LinkLost(resource, command, f"the connection failed ({type(reason).__name__}: {reason})")


def _of_status(status: StatusCode, resource: str, command: str) -> LinkError:
    if status in TIMEOUTS:
        return LinkTimeout(resource, command, "no answer in time")
    if status in ABORTS:
        return LinkAborted(resource, command, "cancelled")
    if status in GARBLED:
        return LinkGarbled(resource, command, f"the answer broke the protocol ({status.name})")
    advice = _ADVICE.get(status, f"VISA says {status.name}")
    return LinkLost(resource, command, advice)


@contextmanager
def translating(resource: str, command: str = "") -> Iterator[None]:
    """Raise ours for whatever the libraries below raise inside.

    Args:
        resource: VISA resource name.
        command: What is being said.

    Yields:
        Nothing.

    Raises:
        LinkError: Whatever went wrong, in our words.
    """
    try:
        yield
    except LinkError:
        raise
    # PyVISA-py is known to let a bare Exception through ("could not connect").
    except Exception as reason:
        raise translated(reason, resource, command) from reason
