"""Finished points of a sweep under way: one product each, in a hidden folder beside the output."""

import os
import re
from contextlib import suppress
from pathlib import Path

from tracer.engine.checkpoint_slots import Checkpoints
from tracer.engine.progress import Note
from tracer.errors import InputError, TracerError
from tracer.product.checksum import data_checksum
from tracer.product.provenance import DISTRIBUTION, package_version
from tracer.product.reading import open_product

_OURS = re.compile(r"\.?[0-9a-f]{20}\.nc(\.checkpoint-[ab])?(\.[0-9a-f]{12}\.part)?")


class PointStore:
    """The folder that holds the points of one output while its sweep is under way."""

    def __init__(self, output: str | os.PathLike[str]) -> None:
        target = Path(os.path.realpath(output))
        self.folder = target.with_name(f".{target.name}.points")
        self._checked: set[str] = set()

    def path(self, identity: str) -> Path:
        """Return the product of the point with this identity, whether it is there or not."""
        return self.folder / f"{identity}.nc"

    def exists(self) -> bool:
        """Return whether an earlier sweep has left something."""
        return self.folder.is_dir() and any(self._entries())

    def make(self) -> None:
        """Make the folder.

        Raises
        ------
        TracerError
            It cannot be made.
        """
        try:
            self.folder.mkdir(exist_ok=True)
        except OSError as error:
            raise TracerError(f"{self.folder}: cannot be made: {error.strerror}") from None

    def remove(self) -> None:
        """Remove what sweeps have left, and the folder unless somebody has put something else into it."""
        with suppress(OSError):
            for entry in self._entries():
                entry.unlink()
            self.folder.rmdir()

    def finished(self, identity: str, note: Note) -> bool:
        """Return whether a point's product is there and whole; a damaged one is removed, with a word.

        Raises
        ------
        InputError
            It was made by another version of the package.
        """
        path = self.path(identity)
        if identity in self._checked or not path.exists():
            return path.exists()
        try:
            with open_product(path) as ds:
                if data_checksum(ds) != ds.attrs.get("data_checksum"):
                    raise InputError("its data do not match its data_checksum")
                source = str(ds.attrs.get("source", ""))
        except (InputError, OSError, RuntimeError) as error:
            note("damaged point", f"a point's product is damaged and is traced again ({error})")
            path.unlink(missing_ok=True)
            return False
        if source != f"{DISTRIBUTION} {package_version()}":
            raise InputError(
                f"{path.name}: was made by {source}; all points of a sweep are made by one version. "
                "Without --resume, --overwrite starts afresh"
            )
        self._checked.add(identity)
        return True

    def checkpoints(self, identity: str, note: Note) -> Checkpoints:
        """Return the checkpoints of a point; it goes on from what is there."""
        path = self.path(identity)
        found = Checkpoints(path, resume=bool(Checkpoints(path).existing()), note=note)
        found.remove_leftovers()
        return found

    def _entries(self) -> list[Path]:
        with suppress(OSError):
            return [entry for entry in self.folder.iterdir() if _OURS.fullmatch(entry.name)]
        return []
