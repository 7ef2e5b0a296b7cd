"""Save a text so that a pulled plug leaves the old file or the new one, never half of either.

Why: benches trip breakers. The new text is complete on the disk before it takes the old one's name, and the
old content stays beside it as `.bak`.
"""

from __future__ import annotations

import contextlib
import os
import secrets
import stat
from pathlib import Path

from benchtool.errors import FileError
from benchtool.printable import printable

LONGEST_NAME = 200


def file_name(path: str | os.PathLike[str]) -> str:
    """The path as a message shows it."""
    return printable(os.fspath(path), LONGEST_NAME)


def reason_of(failure: OSError | ValueError) -> str:
    """Why the system refused, in its own words."""
    return str(getattr(failure, "strerror", None) or failure)


def save_text(path: str | os.PathLike[str], text: str) -> str | None:
    """Write `text` as UTF-8 in place of the file's content and keep the previous content as `.bak`.

    Gives the name of that file, which stands beside the saved one; None where nothing was written over.
    A link is followed, permissions are kept, and a file that holds the text already is left alone.
    FileError with the reason, the file unchanged, where that cannot be done.
    """
    try:
        return _save(Path(os.path.realpath(path)), text.encode("utf-8"), file_name(path))
    except (OSError, ValueError) as failure:
        raise FileError(file_name(path), f"cannot be saved: {reason_of(failure)}") from failure


def _save(target: Path, content: bytes, name: str) -> str | None:
    previous = _previous(target, name)
    if previous is None:
        _replace(target, content, None)
    if previous is None or previous == content:
        return None
    mode = stat.S_IMODE(target.stat().st_mode)
    backup = target.with_name(f"{target.name}.bak")
    _replace(backup, previous, mode)
    _replace(target, content, mode)
    return backup.name


def _previous(target: Path, name: str) -> bytes | None:
    """What stands in the file now; None where there is none."""
    if target.is_symlink():
        raise FileError(name, "cannot be saved: a link that leads round in a circle")
    if not target.exists():
        return None
    if not target.is_file():
        raise FileError(name, "cannot be saved: a folder or device, not a file")
    if not os.access(target, os.W_OK):
        raise FileError(name, "cannot be saved: the file is write-protected")
    return target.read_bytes()


def _replace(target: Path, content: bytes, mode: int | None) -> None:
    temporary = target.with_name(f".{secrets.token_hex(6)}.tmp")
    try:
        with open(temporary, "xb") as stream:
            stream.write(content)
            stream.flush()
            os.fsync(stream.fileno())
        if mode is not None:
            os.chmod(temporary, mode)
        os.replace(temporary, target)
    finally:
        with contextlib.suppress(OSError):  # gone already where the replacing succeeded
            temporary.unlink()
    _sync_folder(target.parent)


def _sync_folder(folder: Path) -> None:
    """Make the new name itself survive a power cut; only POSIX systems can open a folder for that."""
    if os.name != "posix":
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
