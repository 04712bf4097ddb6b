"""A core laboratory's record of its cores and plugs, and the calculations on it."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

from corelab.version import __version__

if TYPE_CHECKING:
    from corelab.lab import Lab


def open_lab(database: str = "corelab.db", by: str = "", password: str | Callable[[str], str] = "") -> Lab:
    """Open a laboratory's record: an SQLite file, or `postgresql+psycopg://…`.

    Parameters
    ----------
    database
        Path or URL; `setup` makes it where there is none.
    by
        The acting person; the login name where empty.
    password
        Where the acting person signs in with one: the password, or a function that asks for it by name.
    """
    from corelab.lab import Lab

    return Lab(database, by, password)


__all__ = ["__version__", "open_lab"]
