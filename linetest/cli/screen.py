"""The technician's screen: what is measured now, how near its decision is, and a large result.

On a terminal the running step is redrawn in place; elsewhere (a pipe, a log) each judgement is one line.
"""

from __future__ import annotations

from rich.console import Console, Group, RenderableType
from rich.live import Live
from rich.panel import Panel
from rich.table import Table
from rich.text import Text

from linetest.decision import interval
from linetest.procedure import (
    CheckStarted,
    Disposition,
    Event,
    Judged,
    Judgement,
    ReadingTaken,
    RunEnded,
    RunStarted,
    StepProgress,
    StepStarted,
)

GAUGE_CELLS = 31

_MARKS = {Judgement.ACCEPT: "✔", Judgement.REJECT: "✘", Judgement.UNDECIDED: "?"}
_STYLES = {Judgement.ACCEPT: "green", Judgement.REJECT: "red", Judgement.UNDECIDED: "yellow"}
_RESULT_STYLES = {
    Disposition.PASS: "bold black on green",
    Disposition.FAIL: "bold white on red",
    Disposition.HOLD: "bold black on yellow",
    Disposition.VOID: "bold white on blue",
}
_WHAT_NEXT = {
    Disposition.PASS: "unit may go on",
    Disposition.FAIL: "unit goes to repair",
    Disposition.HOLD: "unit waits for a quality decision",
    Disposition.VOID: "nothing is said about the unit; test it again",
}


class Screen:
    """Shows one run after another.

    Args:
        console: Where to draw.
        brief: One line a unit instead of every judgement and the large result, for long lists.
    """

    def __init__(self, console: Console, *, brief: bool = False) -> None:
        self._console = console
        self._brief = brief
        self._live: Live | None = None
        self._serial = ""
        self._head = ""
        self._step: StepStarted | None = None
        self._progress: StepProgress | None = None
        self._doing = ""
        self._lines: list[Text] = []

    def show(self, happening: Event) -> None:
        """Take one event and show what it means.

        Args:
            happening: The event, already kept.
        """
        match happening:
            case RunStarted():
                self._begin(happening)
            case CheckStarted():
                self._doing = happening.check
            case ReadingTaken():
                pass  # the judgement that follows says it in a sentence
            case StepStarted():
                self._step, self._progress = happening, None
            case StepProgress():
                self._progress = happening
            case Judged():
                self._judged(happening)
            case RunEnded():
                self._end(happening)
                return
        if self._live is not None:
            self._live.update(self._drawn())

    def close(self) -> None:
        """Give the terminal back, also in the middle of a run."""
        if self._live is not None:
            self._live.stop()
            self._live = None

    def _begin(self, started: RunStarted) -> None:
        self._serial = started.serial
        self._head = f"{started.serial}   {started.model}   station {started.station}"
        if started.lot:
            self._head += f"   lot {started.lot}"
        self._step, self._progress, self._doing, self._lines = None, None, "start", []
        if self._console.is_terminal:
            self._live = Live(self._drawn(), console=self._console, refresh_per_second=10, transient=True)
            self._live.start()

    def _judged(self, judged: Judged) -> None:
        where = judged.check if judged.step is None else f"{judged.check} step {judged.step}"
        line = Text.assemble(
            (f"{_MARKS[judged.judgement]} ", _STYLES[judged.judgement]), (f"{where}: ", "bold"), judged.sentence
        )
        if self._live is not None:
            self._lines.append(line)
        elif not self._brief:
            self._console.print(line)
        self._step, self._progress = None, None

    def _end(self, ended: RunEnded) -> None:
        self.close()
        if self._brief:
            word = Text(f" {ended.disposition} ", style=_RESULT_STYLES[ended.disposition])
            self._console.print(
                Text.assemble(f"{self._serial}  ", word, f"  {ended.sentence}"), overflow="ellipsis", no_wrap=True
            )
            self._print_unsafe(ended)
            return
        for line in self._lines:
            self._console.print(line)
        style = _RESULT_STYLES[ended.disposition]
        spaced = "  ".join(ended.disposition)
        body = Text(justify="center")
        body.append(f"\n   {spaced}   \n", style=style)
        body.append(f"\n{self._serial}", style="bold")
        body.append(f"\n{_WHAT_NEXT[ended.disposition]}")
        if ended.disposition is not Disposition.PASS:
            body.append(f"\n\n{ended.sentence}")
        self._console.print(Panel(body, border_style=style.rsplit(" ", maxsplit=1)[-1], padding=(0, 2)))
        self._print_unsafe(ended)

    def _print_unsafe(self, ended: RunEnded) -> None:
        for role, why in ended.unsafe.items():
            words = f"NOT SAFE: {role.replace('_', ' ')}: {why}. Switch it off by hand."
            self._console.print(Text(words, style="bold red"))

    def _drawn(self) -> RenderableType:
        parts: list[RenderableType] = [Text(self._head, style="bold"), *self._lines]
        if self._step is not None:
            parts.append(_step_table(self._step, self._progress))
        else:
            parts.append(Text(f"… {self._doing}", style="dim"))
        return Panel(Group(*parts), title="under test", title_align="left")


def _step_table(step: StepStarted, progress: StepProgress | None) -> Table:
    bits, errors = (progress.bits, progress.errors) if progress else (0, 0)
    table = Table.grid(padding=(0, 2))
    table.add_row("step", f"{step.check} {step.step} at Eb/N0 {step.ebn0_db:.2f} dB (u {step.u_db:.2f} dB)")
    table.add_row("limit", f"BER {step.limit_ber:.2e}   good unit {step.good_ber:.2e}")
    table.add_row("bits", f"{bits:,} of at most {step.max_bits:,}".replace(",", " "))
    table.add_row("errors", f"{errors:,}".replace(",", " "))
    table.add_row("BER", ber_text(bits, errors))
    table.add_row("decision", gauge(progress.nearness if progress else 0.0))
    return table


def ber_text(bits: int, errors: int) -> str:
    """Bit error rate with its interval, as the screen shows it while counting.

    Args:
        bits: Bits counted.
        errors: Errors among them.

    Returns:
        Text such as ``1.20e-05 (95 %: 9.1e-06 to 1.6e-05)``.
    """
    if bits == 0:
        return "counting"
    low, high = interval(bits, errors)
    return f"{errors / bits:.2e} (95 % of a fixed count: {low:.1e} to {high:.1e})"


def gauge(nearness: float) -> Text:
    """How near the decision is, as a row of cells between REJECT and ACCEPT.

    Args:
        nearness: From -1 (reject boundary) to +1 (accept boundary).

    Returns:
        The row.
    """
    at = round((max(-1.0, min(1.0, nearness)) + 1.0) / 2.0 * (GAUGE_CELLS - 1))
    cells = ["·"] * GAUGE_CELLS
    cells[GAUGE_CELLS // 2] = "|"
    cells[at] = "█"
    return Text.assemble(("REJECT ", "red"), "".join(cells), (" ACCEPT", "green"))
