"""Files that appear whole or not at all."""

from __future__ import annotations

import errno
import os
import secrets
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from unitclass.errors import TargetError

_REMEDIES = {
    errno.ENOSPC: ("the disk is full", "free some space or name another folder"),
    errno.EDQUOT: ("the disk quota is used up", "free some space or name another folder"),
    errno.EFBIG: ("the file would be larger than this system allows", "name another folder"),
    errno.EACCES: ("the folder cannot be written", "name a folder you may write to"),
    errno.EPERM: ("the folder cannot be written", "name a folder you may write to"),
    errno.EROFS: ("the disk is read-only", "name a folder you may write to"),
    errno.ENOENT: ("the folder does not exist", "make it first"),
    errno.ENOTDIR: ("what should be its folder is a file", "name a folder"),
    errno.ENAMETOOLONG: ("the name is too long", "choose a shorter one"),
}


@contextmanager
def written_whole(target: str, *, force: bool = False) -> Iterator[Path]:
    """Yield a temporary path beside `target`; when the block ends well it becomes `target`.

    The temporary file exists, empty, from the start. When the block raises, it is removed and
    whatever stood at `target` is untouched.

    Parameters
    ----------
    target : str
        The file to make. A symbolic link is followed.
    force : bool
        Whether a file that is already there may be replaced.

    Raises
    ------
    TargetError
        If the target exists and `force` is false, is a folder, or its folder cannot be
        written; if the disk fills up; any OSError of the block counts as such.
    """
    final = Path(os.path.realpath(target))
    check_target(target, force=force)
    with _as_target_errors(target):
        temporary = _new_file_beside(final)
        try:
            yield temporary
            _flush(temporary)
            _put_in_place(temporary, final, target, force)
            _flush(final.parent)
        finally:
            temporary.unlink(missing_ok=True)


def check_target(target: str, *, force: bool = False) -> None:
    """Raise TargetError when `target` is no ordinary file, or exists and `force` is false."""
    if os.path.isdir(target):
        raise TargetError("is a folder", where=target, remedy="name a file in it")
    if os.path.exists(target) and not os.path.isfile(target):
        raise TargetError("is a device or a pipe", where=target, remedy="name an ordinary file")
    if os.path.lexists(target) and not force:
        raise _taken(target)


def made_folder(path: str) -> Path:
    """Return the folder `path`, made with its parents if need be; TargetError if it cannot be."""
    try:
        os.makedirs(path, exist_ok=True)
    except FileExistsError:
        raise TargetError("is a file, not a folder", where=path, remedy="name another folder") from None
    except OSError as problem:
        raise target_error(problem, path) from None
    return Path(path)


def target_error(problem: OSError, target: str) -> TargetError:
    """Return the one line that tells the user what `problem` means for writing `target`."""
    code = problem.errno or 0
    what, remedy = _REMEDIES.get(code, (f"cannot be written: {problem.strerror or problem}",
                                        "check the folder and try again"))
    return TargetError(what, where=target, remedy=remedy)


def claim_space(path: Path, n_bytes: int) -> None:
    """Append `n_bytes` of filler to the HDF5 file at `path`, so that its next writer has room.

    HDF5 does not survive a disk that fills up while its caches are written (it may end the
    process). What lies behind the end that an HDF5 file states of itself is overwritten as the
    file grows, and cut off when it is closed: the room is claimed here, where running out of it
    is an ordinary OSError. The filler is random, as some file systems store zeros in no room.
    """
    block = os.urandom(1 << 16)
    with path.open("ab") as file:
        for start in range(0, n_bytes, len(block)):
            file.write(block[: n_bytes - start])
        file.flush()
        os.fsync(file.fileno())


@contextmanager
def _as_target_errors(target: str) -> Iterator[None]:
    try:
        yield
    except OSError as problem:
        raise target_error(problem, target) from problem


def _taken(target: str) -> TargetError:
    return TargetError("exists already", where=target, remedy="give --force to replace it")


def _new_file_beside(final: Path) -> Path:
    # Opened with the user's own umask, so that the result has ordinary permissions.
    temporary = final.parent / f".{final.stem[:100]}.{secrets.token_hex(4)}.part"
    os.close(os.open(temporary, os.O_CREAT | os.O_EXCL | os.O_WRONLY, 0o666))
    return temporary


def _put_in_place(temporary: Path, final: Path, target: str, force: bool) -> None:
    if force:
        os.replace(temporary, final)
        return
    try:
        os.link(temporary, final)  # unlike a rename, fails if the name was taken meanwhile
    except FileExistsError:
        raise _taken(target) from None
    except OSError:  # a file system without hard links
        check_target(target)
        os.replace(temporary, final)


def _flush(path: Path) -> None:
    try:
        handle = os.open(path, os.O_RDONLY)
    except OSError:  # Windows does not open folders
        return
    try:
        os.fsync(handle)
    except OSError as problem:
        if problem.errno not in (errno.EINVAL, errno.ENOTSUP, errno.EBADF):  # network shares
            raise
    finally:
        os.close(handle)
