"""A query over our link against a bare socket and against PyVISA-py's own socket session, same server."""

from __future__ import annotations

import math
import socket
from collections.abc import Iterator

import pyvisa

from benchmarks.timing import medians_s
from linetest.bench import Bench, serve
from linetest.instruments import Link, StationLibrary, load_dialect

QUERIES = 500


def rows() -> Iterator[tuple[str, str, str]]:
    """Rows of query times.

    Yields:
        What, ratio, of what.
    """
    bench = Bench(seed=1, speed=math.inf)
    served = serve(bench)
    resource = served.resources["attenuator"]
    dialect = load_dialect("scpi-attenuator")
    link = Link(resource, dialect, StationLibrary.create())
    link.open()
    inside = Link(
        bench.resources["attenuator"],
        dialect,
        StationLibrary.create({bench.resources["attenuator"]: bench.devices["attenuator"]}),
    )
    inside.open()
    bare = socket.create_connection(("127.0.0.1", int(resource.split("::")[2])))
    bare.setsockopt(socket.IPPROTO_TCP, socket.TCP_NODELAY, 1)
    manager = pyvisa.ResourceManager("@py")
    theirs = manager.open_resource(resource, read_termination="\n", write_termination="\n")

    def asked_bare() -> None:
        for _ in range(QUERIES):
            bare.sendall(b"INP:ATT?\n")
            bare.recv(4096)

    def asked_theirs() -> None:
        for _ in range(QUERIES):
            theirs.query("INP:ATT?")  # type: ignore[attr-defined]  # message-based resources have it

    def asked(through: Link) -> None:
        for _ in range(QUERIES):
            through.ask("INP:ATT?")

    def write_then_query(rounds: int = 5) -> None:
        for _ in range(rounds):
            theirs.write("INP:ATT 20")  # type: ignore[attr-defined]  # message-based resources have it
            theirs.query("INP:ATT?")  # type: ignore[attr-defined]  # message-based resources have it

    def told_then_asked(rounds: int = 5) -> None:
        for _ in range(rounds):
            link.tell("INP:ATT 20")
            link.ask("INP:ATT?")

    times = medians_s(
        {"bare": asked_bare, "theirs": asked_theirs, "link": lambda: asked(link), "inside": lambda: asked(inside)}
    )
    yield "query over a link and a socket", f"{times['link'] / times['bare']:.2f}", "a bare socket"
    yield "query over a link and a socket", f"{times['link'] / times['theirs']:.2f}", "PyVISA-py's socket session"
    yield "query over a link in process", f"{1e6 * times['inside'] / QUERIES:.1f} us", "(absolute)"
    stall = medians_s({"theirs": write_then_query, "link": told_then_asked}, 3)
    yield "setting, error queue and query", f"{stall['link'] / stall['theirs']:.4f}", "PyVISA-py's write, then query"
    bare.close()
    theirs.close()
    manager.close()
    link.close()
    served.close()
