"""A frame into a file that other programs read: CSV, Parquet; and plain text."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from pathlib import Path
from typing import TYPE_CHECKING

from corelab.errors import Unavailable

if TYPE_CHECKING:
    import pandas as pd


def write_csv(path: Path, frame: pd.DataFrame) -> None:
    """UTF-8 with a mark, comma, full precision; the texts as they are, and reading back the same."""
    _replace(path, lambda part: frame.to_csv(part, index=False, encoding="utf-8-sig", lineterminator="\r\n"))


def write_parquet(path: Path, frame: pd.DataFrame) -> None:
    try:
        import pyarrow  # noqa: F401
    except ModuleNotFoundError as missing:
        raise Unavailable("Parquet needs the package pyarrow: install corelab[parquet].") from missing
    _replace(path, lambda part: frame.to_parquet(part, index=False))


def write_text(path: Path, text: str) -> None:
    """UTF-8, as it would stand on the terminal."""
    _replace(path, lambda part: part.write_text(text, encoding="utf-8"))


def write_bytes(path: Path, content: bytes) -> None:
    """A file as it is."""
    _replace(path, lambda part: part.write_bytes(content))


def _replace(path: Path, write: Callable[[Path], object]) -> None:
    with replacing(path) as part:
        write(part)


@contextmanager
def replacing(path: Path) -> Iterator[Path]:
    """A file beside the target, put in its place whole at the end, so that a failure leaves the old file."""
    if not path.absolute().parent.is_dir():
        raise Unavailable(f"There is no folder {path.absolute().parent}: make it first.")
    part = path.with_name(f".{path.name}.part")
    try:
        yield part
        os.replace(part, path)
    except OSError as trouble:
        raise Unavailable(
            f"{path} cannot be written ({trouble.strerror or trouble}): see that the folder is there and the "
            "file is not open elsewhere."
        ) from trouble
    finally:
        with suppress(OSError):
            part.unlink(missing_ok=True)
