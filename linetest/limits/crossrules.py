"""Rules between tables of a limit sheet: names that must meet, curves that must carry the limits."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any, TypeVar

from pydantic import ValidationError

from linetest.decision import fixed_test_bits
from linetest.errors import LinetestError, ParameterError, SheetFault
from linetest.limits.sheet import BerCheck
from linetest.limits.tables import Mode, Strict, named
from linetest.theory import bit_error_rate

# Steeper than this between design loss and margin, a plan degenerates to "no error at all": 0.1 dB of Eb/N0
# then moves the limit more than any count can.
MAX_BER_RATIO = 30.0

_Table = TypeVar("_Table", bound=Strict)


def cross_faults(content: Mapping[str, Any], file_name: str) -> Iterator[SheetFault]:
    """Faults between tables, found also where other tables are wrong in themselves.

    Args:
        content: The file's content as TOML gives it.
        file_name: Name of the file.

    Yields:
        One fault each.
    """
    model = content.get("model")
    if isinstance(model, str) and file_name != f"{model.lower()}.toml":
        yield SheetFault("model", repr(model), f"must be the model that the file is named for ({file_name})")
    if "digest" in content:
        yield SheetFault("digest", repr(content["digest"]), "is no key of this table: it is computed from the file")
    raw_modes = _tables(content.get("mode"))
    procedure = content.get("procedure")
    procedure = procedure if isinstance(procedure, Mapping) else {}
    raw_checks = _tables(procedure.get("ber"))
    yield from _repeated_names("mode", raw_modes)
    yield from _repeated_names("procedure.ber", raw_checks)
    known = [entry.get("name") for entry in raw_modes]
    carrier = procedure.get("carrier")
    if isinstance(carrier, Mapping):
        yield from _unknown_mode("procedure.carrier", carrier, known)
    modes = {mode.name: mode for mode in (_sound(Mode, entry) for entry in raw_modes) if mode is not None}
    for index, entry in enumerate(raw_checks):
        key = f"procedure.ber[{named(raw_checks, index)}]"
        yield from _unknown_mode(key, entry, known)
        check = _sound(BerCheck, entry)
        if check is not None and check.mode in modes:
            yield from _step_faults(key, check, modes[check.mode])


def _tables(value: Any) -> list[Any]:
    return [entry for entry in value if isinstance(entry, Mapping)] if isinstance(value, list) else []


def _sound(table: type[_Table], entry: Mapping[str, Any]) -> _Table | None:
    try:
        return table.model_validate(entry)
    except ValidationError:
        return None


def _repeated_names(key: str, entries: list[Any]) -> Iterator[SheetFault]:
    names = [entry.get("name") for entry in entries]
    for name in dict.fromkeys(name for name in names if isinstance(name, str) and names.count(name) > 1):
        yield SheetFault(f"{key}[{name}].name", repr(name), "must be a name used once")


def _unknown_mode(key: str, entry: Mapping[str, Any], known: list[Any]) -> Iterator[SheetFault]:
    mode = entry.get("mode")
    if isinstance(mode, str) and mode not in known:
        listed = ", ".join(name for name in known if isinstance(name, str)) or "none is given"
        yield SheetFault(f"{key}.mode", repr(mode), f"must be a mode of this sheet ({listed})")


def reachable_ebn0_db(check: BerCheck, nominal_ebn0_db: float) -> tuple[float, float]:
    """Least and greatest Eb/N0 that the sheet's setting rule lets a step have.

    Args:
        check: The check.
        nominal_ebn0_db: Nominal Eb/N0 of the step, dB.

    Returns:
        Both ends, dB.
    """
    below_db = 0.0 if check.setting_rule == "from-above" else check.tolerance_db
    above_db = 0.0 if check.setting_rule == "from-below" else check.tolerance_db
    return nominal_ebn0_db - below_db, nominal_ebn0_db + above_db


def _step_faults(key: str, check: BerCheck, mode: Mode) -> Iterator[SheetFault]:
    for step_db in check.steps:
        least_db, most_db = reachable_ebn0_db(check, step_db)
        try:
            bit_error_rate(mode.scheme, least_db - check.margin_db)
            limit_ber = bit_error_rate(mode.scheme, most_db - check.margin_db)
            design_ber = bit_error_rate(mode.scheme, most_db - check.design_loss_db)
        except ParameterError as reason:
            rule = f"must, less margin and tolerance, {reason.rule}"
            yield SheetFault(f"{key}.steps", f"{step_db:g}", rule)
            continue
        if limit_ber > MAX_BER_RATIO * design_ber:
            rule = (
                f"must not differ by more than a factor {MAX_BER_RATIO:g} in bit error rate between margin and "
                f"design loss (here {limit_ber / design_ber:.0f}): judge the channel or the inner decoder instead"
            )
            yield SheetFault(f"{key}.steps", f"{step_db:g}", rule)
            continue
        yield from _too_few_bits(key, check, mode, step_db, (design_ber, limit_ber))


def _too_few_bits(
    key: str, check: BerCheck, mode: Mode, step_db: float, bers: tuple[float, float]
) -> Iterator[SheetFault]:
    design_ber, limit_ber = bers
    try:
        needed = fixed_test_bits(
            good_ber=design_ber,
            limit_ber=limit_ber,
            producer_risk=check.step_producer_risk,
            consumer_risk=check.consumer_risk,
            burst_weights=mode.burst_weights,
        )
    except LinetestError as reason:
        yield SheetFault(f"{key}.steps", f"{step_db:g}", f"must be a step for which a plan exists: {reason}")
        return
    if check.max_bits < needed:
        rule = f"must be at least the best fixed test, {needed} bits at step {step_db:g} dB"
        yield SheetFault(f"{key}.max_bits", f"{check.max_bits}", rule)
