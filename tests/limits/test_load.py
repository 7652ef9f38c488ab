"""Reading limit sheets: all faults at once, each with key, value and rule."""

from __future__ import annotations

import hashlib
from pathlib import Path

import pytest

from linetest.errors import ParameterError, SettingsError, SheetError
from linetest.limits import list_sheets, load_model, load_sheet
from tests.limits.conftest import SHIPPED, WriteSheet


def faults_of(file: Path) -> dict[str, tuple[str, str]]:
    with pytest.raises(SheetError) as caught:
        load_sheet(file)
    assert caught.value.path == file
    return {fault.key: (fault.value, fault.rule) for fault in caught.value.faults}


def test_sound_sheet_is_read_with_the_digest_of_its_bytes(write_sheet: WriteSheet) -> None:
    file = write_sheet()
    sheet = load_sheet(file)
    assert (sheet.model, sheet.revision) == ("BW-Q4", "1")
    assert sheet.digest == hashlib.sha256(file.read_bytes()).hexdigest()
    assert sheet.mode("qpsk-2048").scheme == "qpsk"
    assert sheet.check("ber").steps == (6.8, 8.4, 9.6, 10.5)


def test_every_fault_is_told_at_once_in_the_order_of_the_file(write_sheet: WriteSheet) -> None:
    file = write_sheet(
        ('revision = "1"', 'revision = ""'),
        ('scheme = "qpsk"', 'scheme = "qpks"'),
        ("min_current_a = 0.40", "min_current_a = 0.90"),
        ("timeout_s = 2.0", 'timeout_s = "2"'),
        ("steps = [6.8, 8.4", "steps = [8.4, 6.8"),
        ("design_loss_db = 0.5", "design_loss_db = 1.5"),
        ("consumer_risk = 0.01", "consumer_risk = 0.5"),
        ('mode = "qpsk-2048"\nsteps', 'mode = "qpsk-2049"\nsteps'),
    )
    with pytest.raises(SheetError) as caught:
        load_sheet(file)
    assert [fault.key for fault in caught.value.faults] == [
        "revision",
        "mode[qpsk-2048].scheme",
        "procedure.supply.max_current_a",
        "procedure.lock.timeout_s",
        "procedure.ber[ber].mode",
        "procedure.ber[ber].steps",
        "procedure.ber[ber].design_loss_db",
        "procedure.ber[ber].consumer_risk",
    ]
    sentence = str(caught.value)
    assert sentence.startswith(f"{file} has 8 faults to correct:")
    assert "mode[qpsk-2048].scheme = 'qpks': must be one of bpsk" in sentence
    assert "procedure.ber[ber].mode = 'qpsk-2049': must be a mode of this sheet (qpsk-2048)" in sentence


@pytest.mark.parametrize(
    ("old", "new", "key", "value", "rule"),
    [
        ("margin_db = 1.0", "margin_db = 0.4", "procedure.ber[ber].design_loss_db", "0.5", "less than margin_db (0.4)"),
        ("margin_db = 1.0", "margin_db = -1.0", "procedure.ber[ber].margin_db", "-1.0", "must be greater than 0"),
        ("margin_db = 1.0", "margin_db = nan", "procedure.ber[ber].margin_db", "nan", "must be a finite number"),
        ("margin_db = 1.0", "margin_db = true", "procedure.ber[ber].margin_db", "True", "must be a number"),
        ("margin_db = 1.0\n", "", "procedure.ber[ber].margin_db", "(missing)", "must be given"),
        ("max_bits = 20_000_000", "max_bits = 20_000_000.0", "procedure.ber[ber].max_bits", "20000000.0", "integer"),
        ("producer_risk = 0.04", "producer_risk = 0.0", "procedure.ber[ber].producer_risk", "0.0", "greater than 0"),
        (
            "margin_db = 1.0",
            "margin_db = 1.0\nmargine_db = 1.0",
            "procedure.ber[ber].margine_db",
            "1.0",
            "did you mean margin_db?",
        ),
        (
            "symbol_rate_bd = 1_024_000",
            "symbol_rate_bd = 1_030_000",
            "mode[qpsk-2048].symbol_rate_bd",
            "1030000",
            "-0.025 dB off what modulation and coding give",
        ),
        (
            "burst_weights = [[1, 1.0]]",
            "burst_weights = [[1, 0.5], [2, 0.4]]",
            "mode[qpsk-2048].burst_weights",
            "[[1, 0.5], [2, 0.4]]",
            "they sum to 0.9",
        ),
        (
            "burst_weights = [[1, 1.0]]",
            "burst_weights = [[2, 0.5], [1, 0.5]]",
            "mode[qpsk-2048].burst_weights",
            "[[2, 0.5], [1, 0.5]]",
            "ascending, each once",
        ),
        ('pattern = "prbs23"', 'pattern = "prbs22"', "mode[qpsk-2048].pattern", "'prbs22'", "must be one of"),
        ("max_dbm = -18.0", "max_dbm = -23.0", "procedure.carrier.max_dbm", "-23.0", "above min_dbm (-22)"),
        (
            'serial_pattern = "Brack',
            'serial_pat = "Brack',
            "source",
            "{…}",
            "must say where serial_pattern comes from",
        ),
        ("'BQ4-[0-9]{6}'", "'BQ4-.*'", "serial_pattern", "'BQ4-.*'", "serials become file names"),
        ("'BQ4-[0-9]{6}'", "'BQ4-[0-z]'", "serial_pattern", "'BQ4-[0-z]'", "serials become file names"),
        ("'BQ4-[0-9]{6}'", "'BQ4-[^-]'", "serial_pattern", "'BQ4-[^-]'", "serials become file names"),
        ("'BQ4-[0-9]{6}'", "'(BQ4'", "serial_pattern", "'(BQ4'", "must be a regular expression"),
        ("'BQ4-[0-9]{6}'", "'[0-9]?'", "serial_pattern", "'[0-9]?'", "must not match an empty serial"),
        ('model = "BW-Q4"', 'model = "BW-Q5"', "model", "'BW-Q5'", "the file is named for (bw-q4.toml)"),
        ('model = "BW-Q4"', 'model = "BW-Q4"\ndigest = "0"', "digest", "'0'", "it is computed from the file"),
        ('setting_rule = "nearest"', 'setting_rule = "near"', "procedure.ber[ber].setting_rule", "'near'", "'nearest'"),
        ("max_bits = 20_000_000", "max_bits = 1_000_000", "procedure.ber[ber].max_bits", "1000000", "best fixed test"),
        ("steps = [6.8,", "steps = [nan,", "procedure.ber[ber].steps[1]", "nan", "must be a finite number"),
    ],
)
def test_fault_names_key_value_and_rule(
    write_sheet: WriteSheet, old: str, new: str, key: str, value: str, rule: str
) -> None:
    file = write_sheet((old, new))
    found = faults_of(file)
    assert key in found
    assert found[key][0] == value
    assert rule in found[key][1]


def test_missing_sources_are_named_together(write_sheet: WriteSheet) -> None:
    text = (SHIPPED / "bw-q4.toml").read_text(encoding="utf-8")
    table = text[text.index("[procedure.carrier.source]") : text.index("[procedure.lock]")]
    found = faults_of(write_sheet((table, "")))
    assert found["procedure.carrier.source"] == (
        "(missing)",
        "must say where min_dbm, max_dbm, max_change_db comes from",
    )


def test_modes_and_checks_are_named_once(write_sheet: WriteSheet) -> None:
    text = (SHIPPED / "bw-q4.toml").read_text(encoding="utf-8")
    mode = text[text.index("[[mode]]") : text.index("[procedure.supply]")]
    check = text[text.index("[[procedure.ber]]") :]
    found = faults_of(write_sheet((mode, mode + mode), (check, check + check)))
    assert found["mode[qpsk-2048].name"][1] == "must be a name used once"
    assert found["procedure.ber[ber].name"][1] == "must be a name used once"


@pytest.mark.parametrize(
    ("content", "rule"),
    [
        (b"model = ", "is not TOML: Invalid value (at end of document)"),
        (b'model = "A"\nmodel = "B"\n', "is not TOML: Cannot overwrite a value (at line 2, column 12)"),
        (b"model = \xff", "must be text in UTF-8; byte 8 is not"),
        (b"a = " + b"[" * 20_000, "is not TOML: tables nested too deep"),
        (b"#" * 1_000_001, "must be a limit sheet, not 1000001 bytes of something else"),
    ],
)
def test_file_that_is_no_sheet_is_one_sentence(tmp_path: Path, content: bytes, rule: str) -> None:
    file = tmp_path / "bw-q4.toml"
    file.write_bytes(content)
    assert faults_of(file) == {"(file)": ("bw-q4.toml", rule)}


def test_file_that_is_not_there(tmp_path: Path) -> None:
    assert faults_of(tmp_path / "bw-q9.toml") == {"(file)": ("bw-q9.toml", "cannot be read: no such file or directory")}
    assert faults_of(tmp_path) == {"(file)": (tmp_path.name, "cannot be read: is a directory")}


def test_empty_file_lacks_everything(tmp_path: Path) -> None:
    file = tmp_path / "bw-q4.toml"
    file.write_bytes(b"")
    found = faults_of(file)
    assert {key for key, (value, _) in found.items() if value == "(missing)"} == {
        "model",
        "title",
        "revision",
        "serial_pattern",
        "firmware",
        "mode",
        "procedure",
        "source",
    }


def test_tables_of_the_wrong_shape_are_faults_not_crashes(tmp_path: Path) -> None:
    file = tmp_path / "bw-q4.toml"
    file.write_text('model = "BW-Q4"\nmode = 3\nprocedure = [1]\n', encoding="utf-8")
    found = faults_of(file)
    assert found["mode"][0] == "3"
    assert found["procedure"][0] == "[1]"
    file.write_text('model = 3\nmode = [1, "x"]\n[procedure]\nber = [4]\ncarrier = "no"\n', encoding="utf-8")
    found = faults_of(file)
    assert found["model"][0] == "3"
    assert found["procedure.ber[1]"][0] == "4"
    assert found["procedure.carrier"][0] == "'no'"


def test_sheet_is_found_by_model_in_either_case() -> None:
    assert load_model("BW-Q4").digest == load_model("bw-q4", SHIPPED).digest


@pytest.mark.parametrize("model", ["BW-Q5", "../bw-q4", "", "bw-q4.toml"])
def test_unknown_model_names_those_known(model: str) -> None:
    with pytest.raises(ParameterError, match=r"but must be one of BW-B2, BW-Q4, BW-Q4C"):
        load_model(model, SHIPPED)


def test_folder_without_sheets_is_an_error(tmp_path: Path) -> None:
    with pytest.raises(SettingsError, match="holds no limit sheet"):
        list_sheets(tmp_path)
    with pytest.raises(SettingsError, match="does not exist"):
        list_sheets(tmp_path / "nowhere")


def test_one_wrong_sheet_stops_the_list(write_sheet: WriteSheet) -> None:
    file = write_sheet(("margin_db = 1.0", "margin_db = 0.0"))
    with pytest.raises(SheetError, match=r"margin_db = 0\.0"):
        list_sheets(file.parent)
