"""Files that are written whole or not at all."""

from __future__ import annotations

import os
import secrets
from collections.abc import Iterator, Sequence
from contextlib import contextmanager, suppress
from pathlib import Path

from bemt.errors import RunError


def check_target(path: str | Path) -> Path:
    """Find out whether a file can be written, before any time goes into computing it.

    Parameters
    ----------
    path : str or pathlib.Path
        The file that is to be written; it need not exist, its folder must.

    Returns
    -------
    pathlib.Path
        The path itself, or what it points to where it is a link.

    Raises
    ------
    RunError
        If the folder is missing or closed to writing, or if something that is not a plain file stands in the way.
    """
    target = Path(os.path.realpath(path))
    folder = target.parent
    if not folder.is_dir():
        raise RunError(f"cannot write {path}: there is no folder {folder}")
    if target.exists() and not target.is_file():
        # Replacing a device or a folder by a file would do harm; a program run by root could even do it.
        raise RunError(f"cannot write {path}: it exists and is not a plain file")
    if not os.access(folder, os.W_OK | os.X_OK):
        raise RunError(f"cannot write {path}: the folder {folder} is not writable")
    return target


@contextmanager
def replacing(paths: Sequence[str | Path]) -> Iterator[tuple[Path, ...]]:
    """Hand out temporary files beside the targets and move them into place when all are complete.

    Parameters
    ----------
    paths : sequence of str or pathlib.Path
        The files that are to be written.

    Yields
    ------
    tuple of pathlib.Path
        One temporary path a target, in the same folder and with the same ending. Nothing exists there yet.

    Raises
    ------
    RunError
        If a target cannot be written; the targets are then as they were.
    """
    targets = [check_target(path) for path in paths]
    drafts = tuple(target.with_name(f".{target.stem}-{secrets.token_hex(6)}{target.suffix}") for target in targets)
    try:
        yield drafts
        for draft, target in zip(drafts, targets, strict=True):
            os.replace(draft, target)
    except OSError as error:
        named = ", ".join(str(path) for path in paths)
        raise RunError(f"cannot write {named}: {error.strerror or error}") from error
    finally:
        for draft in drafts:
            with suppress(OSError):
                draft.unlink(missing_ok=True)
