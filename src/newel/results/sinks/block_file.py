"""A file that is written in whole blocks, and cut back to the last whole one where a write fails."""

from __future__ import annotations

import errno
import os
import stat

from newel.errors import OutputExists

__all__ = ["BlockFile"]


class BlockFile:
    """The file under a sink that writes text.

    Nothing that exists is touched before the first block: a file that is to be overwritten is emptied then,
    so that a march which cannot begin loses nothing. A pipe or a device is no file to lose and needs no
    `overwrite`.

    Args:
        path: where to write.
        overwrite: whether a file that is there may be replaced.

    Attributes:
        half_written: whether the last write failed and what it left could not be cut off.
    """

    def __init__(self, path: str | os.PathLike[str], overwrite: bool = False) -> None:
        self.path = os.fsdecode(path)
        self.overwrite = overwrite
        self.half_written = False
        self._descriptor: int | None = None
        self._created = False
        self._started = False
        self._whole = 0

    def open(self) -> None:
        """Make the file ready.

        Raises:
            OutputExists: if a file is there and `overwrite` is False.
            OSError: if it cannot be written.
        """
        if os.path.isdir(self.path):
            raise IsADirectoryError(errno.EISDIR, os.strerror(errno.EISDIR), self.path)
        flags = os.O_WRONLY | getattr(os, "O_BINARY", 0)
        self.half_written, self._started, self._whole = False, False, 0
        try:
            self._descriptor = os.open(self.path, flags | os.O_CREAT | os.O_EXCL, 0o666)
            self._created = True
        except FileExistsError:
            if not self.overwrite and _is_regular(self.path):
                raise OutputExists(self.path) from None
            self._descriptor = os.open(self.path, flags)
            self._created = False

    def write(self, text: str) -> None:
        """Write one block in whole. Raises OSError; the file is then cut back to the block before."""
        if self._descriptor is None:
            raise ValueError(f"{self.path} is not open")
        if not self._started:
            self._empty()
        data = memoryview(text.encode())
        done = 0
        try:
            while done < len(data):
                done += os.write(self._descriptor, data[done:])
        except BaseException:
            self._cut_back()
            raise
        self._whole += done

    def close(self) -> None:
        """Close the file; does nothing the second time. Raises OSError if the system could not keep it."""
        descriptor, self._descriptor = self._descriptor, None
        if descriptor is not None:
            os.close(descriptor)

    def discard(self) -> None:
        """Close the file before anything was written, and remove it if it was made here."""
        self.close()
        if self._created and not self._started:
            os.unlink(self.path)

    def finish(self, head: str) -> None:
        """Close the file; where no block came, what is in it is the head alone."""
        try:
            if self._descriptor is not None and not self._started:
                self.write(head)
        finally:
            self.close()

    @property
    def started(self) -> bool:
        """Whether a block has been written."""
        return self._started

    def _empty(self) -> None:
        self._started = True
        if not self._created and self._descriptor is not None and _is_regular(self.path):
            os.ftruncate(self._descriptor, 0)

    def _cut_back(self) -> None:
        self.half_written = True
        try:
            if self._descriptor is not None:
                os.ftruncate(self._descriptor, self._whole)
                os.lseek(self._descriptor, self._whole, os.SEEK_SET)
                self.half_written = False
        except OSError:
            pass


def _is_regular(path: str) -> bool:
    try:
        return stat.S_ISREG(os.stat(path).st_mode)
    except OSError:
        return True
