"""Who may do what: one table, asked in one place below every door."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from corelab.errors import Problem, Refused, Usage
from corelab.records.schema import ROLES

_BENCH = frozenset({"technician", "reviewer", "manager"})
_ROCK = frozenset({"reviewer", "geologist", "manager"})
_ALL = frozenset(ROLES)

#: act -> the roles that may do it. Whoever can open the lab may look at it.
MAY: Mapping[str, frozenset[str]] = MappingProxyType(
    {
        "load bench sheets": _BENCH,
        "load descriptions and crush verdicts": _ALL,
        "withdraw readings": _BENCH,
        "read in logs and other laboratories' results": _ALL,
        "match depths": _ROCK,
        "recalibrate the crush likelihood": _ROCK,
        "approve results": frozenset({"reviewer", "manager"}),
        "revoke approvals": frozenset({"reviewer", "manager"}),
        "release what control blocks": frozenset({"manager"}),
        "write files": _ALL,
        "issue files to a partner": _ROCK,
        "recompute results": frozenset({"reviewer", "manager"}),
        "say what partners are entitled to": frozenset({"manager"}),
        "change settings": frozenset({"manager"}),
        "register people": frozenset({"manager"}),
        "set one's own password": _ALL,
        "set another's password": frozenset({"manager"}),
        "back up": _BENCH,
        "restore": frozenset({"manager"}),
    }
)
#: Sheets on which what the eye saw is recorded, and no instrument.
DESCRIBED = frozenset({"descriptions", "crush verdicts"})

#: Common practice; longer is better, and no rule on what kinds of characters.
LEAST_CHARACTERS = 10


def require(act: str, person: str, role: str) -> None:
    """Refuse an act that is not for this role.

    Raises
    ------
    Refused
        With who may do it.
    """
    if role not in MAY[act]:
        allowed = [r for r in ROLES if r in MAY[act]]
        who = " or ".join([", ".join(allowed[:-1]), allowed[-1]] if len(allowed) > 1 else allowed)
        raise Refused(
            [Problem(f"{person}, {role}", f"a {who}", "ask one of them to do it")],
            f"Nothing was written: {person} may not {act}.",
        )


def secret_of(password: str) -> str:
    """What is kept of a password: an argon2id hash with a salt of its own."""
    from argon2 import PasswordHasher

    if len(password) < LEAST_CHARACTERS:
        raise Usage(f"A password has at least {LEAST_CHARACTERS} characters.")
    if any("\ud800" <= character <= "\udfff" for character in password):
        raise Usage("A password is text in UTF-8, and these bytes are none: type it again.")
    return PasswordHasher().hash(password)


def check_password(person: str, secret: str, password: str) -> None:
    """Refuse a password that does not fit.

    Raises
    ------
    Refused
        With the same words whether none was given or a wrong one.
    """
    from argon2 import PasswordHasher
    from argon2.exceptions import Argon2Error, InvalidHashError

    try:
        PasswordHasher().verify(secret, password)
    except (Argon2Error, InvalidHashError, UnicodeEncodeError) as wrong:
        raise Refused(
            [
                Problem(
                    "no password that fits",
                    f"the password of {person}",
                    "type it when asked, or put it into CORELAB_PASSWORD; a manager can set a new one",
                )
            ],
            f"Nothing was written: {person} signs in with a password.",
        ) from wrong
