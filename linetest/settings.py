"""Where things are: the database, the folders, the station sheet.

Each setting is looked up in this order: the option given on the command line, the environment
(``LINETEST_DATABASE_URL`` and its like), the settings file, the default. The settings file is TOML, at
``LINETEST_SETTINGS_FILE`` or ``settings.toml`` in the user's configuration folder for linetest::

    database_url = "sqlite:///var/lib/linetest/records.db"
    limits_folder = "/srv/linetest/limits"
    station_sheet = "/etc/linetest/station-a1.toml"
    certificates_folder = "/srv/linetest/certificates"
    templates_folder = "/srv/linetest/templates"
"""

from __future__ import annotations

import os
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from linetest.errors import SettingsError

KEYS = ("database_url", "limits_folder", "station_sheet", "certificates_folder", "templates_folder")


@dataclass(frozen=True, slots=True)
class Settings:
    """Where linetest finds and keeps its things.

    Attributes:
        database_url: SQLAlchemy URL of the database.
        limits_folder: Folder of limit sheets.
        station_sheet: The station sheet of this station, or None where none is set.
        certificates_folder: Folder that issued certificates go to.
        templates_folder: Folder of page templates.
    """

    database_url: str
    limits_folder: Path
    station_sheet: Path | None
    certificates_folder: Path
    templates_folder: Path


def shipped_folder(name: str) -> Path:
    """Folder of files that come with linetest.

    Args:
        name: ``limits`` or ``templates``.

    Returns:
        The folder inside the installed package, or in the checkout where linetest runs from one.

    Raises:
        SettingsError: Neither place holds it: the installation is incomplete.
    """
    package = Path(__file__).resolve().parent
    checkout = {"limits": package.parent / "limits", "templates": package.parent / "reports" / "templates"}
    for folder in (package / "shipped" / name, checkout[name]):
        if folder.is_dir():
            return folder
    raise SettingsError(f"the folder {name!r} that ships with linetest is missing beside {package}; install it again")


def load_settings(
    options: Mapping[str, str | None] | None = None, environment: Mapping[str, str] | None = None
) -> Settings:
    """Settings by option, environment, file and default, in that order.

    Args:
        options: Values given on the command line by key; None where not given.
        environment: Environment variables; the process's own by default.

    Returns:
        The settings.

    Raises:
        SettingsError: The settings file cannot be read, is not TOML, or has an unknown key.
    """
    given = {key: value for key, value in (options or {}).items() if value is not None}
    env = os.environ if environment is None else environment
    from_file = _read_settings_file(env)

    def chosen(key: str) -> str | None:
        return given.get(key) or env.get(f"LINETEST_{key.upper()}") or from_file.get(key)

    data = _data_folder
    return Settings(
        database_url=chosen("database_url") or f"sqlite:///{data() / 'records.db'}",
        limits_folder=_folder(chosen("limits_folder")) or shipped_folder("limits"),
        station_sheet=_folder(chosen("station_sheet")),
        certificates_folder=_folder(chosen("certificates_folder")) or data() / "certificates",
        templates_folder=_folder(chosen("templates_folder")) or shipped_folder("templates"),
    )


def _folder(text: str | None) -> Path | None:
    return None if text is None else Path(text).expanduser()


def _data_folder() -> Path:
    from platformdirs import user_data_path

    return user_data_path("linetest", appauthor=False)


def _read_settings_file(environment: Mapping[str, str]) -> dict[str, str]:
    named = environment.get("LINETEST_SETTINGS_FILE")
    if named:
        path = Path(named).expanduser()
    else:
        from platformdirs import user_config_path

        path = user_config_path("linetest", appauthor=False) / "settings.toml"
        if not path.exists():
            return {}
    try:
        content = tomllib.loads(path.read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError) as reason:
        raise SettingsError(
            f"the settings file {path} cannot be read ({reason}); correct LINETEST_SETTINGS_FILE"
        ) from reason
    except tomllib.TOMLDecodeError as reason:
        raise SettingsError(f"the settings file {path} is not TOML: {reason}") from reason
    wrong = [key for key, value in content.items() if key not in KEYS or not isinstance(value, str)]
    if wrong:
        raise SettingsError(
            f"the settings file {path} has {', '.join(sorted(wrong))}; "
            f"it may hold text values for {', '.join(KEYS)} only"
        )
    return dict(content)
