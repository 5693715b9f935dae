"""A project folder: where things lie, one writer at a time, no file ever half written."""

from __future__ import annotations

import contextlib
import os
import secrets
import tempfile
from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import TYPE_CHECKING, Literal

import filelock

from relook.errors import Place, RelookError
from relook.project.setup.settings import SETTINGS_FILE, Settings, load_settings

if TYPE_CHECKING:  # opening a folder needs no pandas
    from relook.tables.reading import Table

_LOCK_SECONDS = 20
#: What goes out and comes back: rounds of second looks, or codings, each with fresh labels.
Area = Literal["rounds", "codings"]


@dataclass(frozen=True, slots=True)
class Project:
    """An opened project folder.

    Attributes
    ----------
    root : Path
        The folder that holds relook.toml, absolute.
    settings : Settings
    area : {"rounds", "codings"}
        Which part of the folder the properties below speak of. Coding sheets go out, come back and
        are recorded as worksheets are, one coding in the place of one round.
    tables : dict of Path to Table
        Tables that were read while the settings were guessed, by whole path.
    """

    root: Path
    settings: Settings
    area: Area = "rounds"
    tables: dict[Path, Table] = field(default_factory=dict, compare=False, repr=False)

    @classmethod
    def open(cls, root: Path) -> Project:
        """Open a folder that holds a relook.toml.

        Raises
        ------
        RelookError
            No such folder, no relook.toml in it, or problems in that file.
        """
        root = Path(root).absolute()
        if not root.is_dir():
            raise RelookError(
                "no such folder", where=Place(str(root)), mend="check the path, or run `relook new`"
            )
        return cls(root, load_settings(root / SETTINGS_FILE))

    @property
    def title(self) -> str:
        """What to call the project where it is given no title: its folder's name in words."""
        return self.root.name.removesuffix("-relook").replace("_", " ")

    @property
    def shown_root(self) -> str:
        """The folder as the user would type it; whole where they stand outside of it."""
        with contextlib.suppress(ValueError):
            return str(self.root.relative_to(Path.cwd()))
        return str(self.root)

    @property
    def codings(self) -> Project:
        """The same folder, as far as it holds codings."""
        return replace(self, area="codings")

    @property
    def rounds_folder(self) -> Path:
        """Where the rounds, or codings, are."""
        return self.root / self.area

    @property
    def decisions_folder(self) -> Path:
        """Where the record of decisions, or of fresh labels, is."""
        if self.area == "codings":
            return self.rounds_folder / "record"
        return self.root / "decisions"

    def round_folder(self, number: int) -> Path:
        """Where one round is."""
        return self.rounds_folder / f"{number:02d}"

    def worksheets_folder(self, number: int) -> Path:
        """Where a round's worksheets are written: the only folder to send."""
        return self.round_folder(number) / "worksheets"

    def returned_folder(self, number: int) -> Path:
        """Where a round's worksheets are put when they come back."""
        return self.round_folder(number) / "returned"

    def relative(self, path: Path) -> str:
        """Name a path as the user would: from the project folder, with forward slashes."""
        with contextlib.suppress(ValueError):
            return Path(path).absolute().relative_to(self.root).as_posix()
        return str(path)

    @property
    def has_secret(self) -> bool:
        """Whether the project has a secret already."""
        return self._secret_file.exists()

    @property
    def _secret_file(self) -> Path:
        return self.root / ".relook" / "secret"

    def secret(self) -> bytes:
        """Return the project's secret, making it on first use.

        It keys row codes, worksheet ids and shuffles, so that nothing in a worksheet can be
        inverted by someone who knows the project's settings.

        Raises
        ------
        RelookError
            The secret is damaged, or missing although rounds were written with one.
        """
        if not self.has_secret:
            self.keep_secret(self.secret_or_new())
        return self.secret_or_new()

    def secret_or_new(self) -> bytes:
        """Return the project's secret, or a new one that nothing is done with yet.

        Raises
        ------
        RelookError
            As for `secret`.
        """
        file = self._secret_file
        where = Place(self.relative(file))
        if not file.exists():
            if any(self.root.glob("rounds/*/round.json")) or any(
                self.root.glob("codings/*/round.json")
            ):
                raise RelookError(
                    "the project's secret is missing, and rounds were already written with it",
                    where=where,
                    mend="restore the hidden folder .relook from a copy of the project folder",
                )
            return secrets.token_bytes(32)
        text = file.read_text(encoding="ascii", errors="replace").strip()
        try:
            secret = bytes.fromhex(text)
        except ValueError:
            secret = b""
        if len(secret) < 16:
            raise RelookError(
                "the project's secret is damaged",
                where=where,
                mend="restore the file from a copy of the project folder",
            )
        return secret

    def keep_secret(self, secret: bytes) -> None:
        """Write the project's first secret."""
        write_whole(self._secret_file, secret.hex().encode("ascii") + b"\n")
        with contextlib.suppress(OSError):  # some file systems have no permission bits
            self._secret_file.chmod(0o600)

    @contextlib.contextmanager
    def lock(self) -> Iterator[None]:
        """Hold the project for writing.

        Raises
        ------
        RelookError
            Another relook has held it for 20 seconds, or the folder cannot be written.
        """
        file = self.root / ".relook" / "lock"
        try:
            file.parent.mkdir(exist_ok=True)
            held = filelock.FileLock(file, timeout=_LOCK_SECONDS)
            held.acquire()
        except filelock.Timeout:
            raise RelookError(
                "another relook is writing to this project",
                where=Place(str(self.root)),
                mend="wait until it has finished and run the command again",
            ) from None
        except OSError as error:
            raise _cannot_write(self.root, error) from None
        try:
            yield
        finally:
            held.release()


def write_whole(path: Path, data: bytes, *, force: bool = True) -> None:
    """Write a file so that nobody ever sees half of it.

    The bytes go to a new file beside it, are forced to disk, and take the name in one step.

    Parameters
    ----------
    path : Path
        Its folder is made where missing.
    data : bytes
    force : bool
        Whether an existing file may be replaced.

    Raises
    ------
    RelookError
        The file exists and `force` is false, or it cannot be written.
    """
    if not force and path.exists():
        raise RelookError(
            "the file exists already",
            where=Place(str(path)),
            mend="choose another name, or add --force to replace it",
        )
    temporary = None
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        with tempfile.NamedTemporaryFile(
            dir=path.parent, prefix=f".{path.name}.", suffix=".part", delete=False
        ) as file:
            temporary = Path(file.name)
            file.write(data)
            file.flush()
            os.fsync(file.fileno())
        temporary.chmod(0o666 & ~_umask())
        temporary.replace(path)
        _sync_folder(path.parent)
    except OSError as error:
        raise _cannot_write(path, error) from None
    finally:
        if temporary is not None and temporary.exists():
            with contextlib.suppress(OSError):
                temporary.unlink()


def _umask() -> int:
    current = os.umask(0o022)
    os.umask(current)
    return current


def _sync_folder(folder: Path) -> None:
    """Force a rename to disk where the system can (Windows cannot open folders)."""
    with contextlib.suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _cannot_write(path: Path, error: OSError) -> RelookError:
    mend = "check that the disk has room and that you may write there"
    if isinstance(error, PermissionError):
        mend = "close it in the spreadsheet program if it is open there, or check your permissions"
    return RelookError(
        f"cannot write: {error.strerror or error}", where=Place(str(path)), mend=mend
    )
