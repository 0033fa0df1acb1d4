"""The faults of an exchange folder, gathered until all of them are known."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass, field

from electrolog.errors import FaultyRows, shortened, unknown
from electrolog.record.sheets import SHEETS

FILES = tuple(f"{sheet.name}.csv" for sheet in SHEETS if sheet.exchanged)
COMPARISONS = 100_000  # names looked at for a nearest one, in all; beyond it a wrong file would take minutes to refuse


@dataclass
class Faults:
    _found: list[tuple[int, int, str]] = field(default_factory=list)
    _comparisons: int = 0

    def __bool__(self) -> bool:
        return bool(self._found)

    def add(self, file: str, line: int, said: str) -> None:
        """Line 0 stands for the file as a whole."""
        place = f"{file} line {line}, " if line else f"{file}: "
        rank = FILES.index(file) if file in FILES else -1
        self._found.append((rank, line, place + printable(said)))

    def unknown(self, what: str, found: str, known: Collection[str], hint: str = "") -> str:
        """Why a name is refused, with its nearest neighbour as long as looking for one takes no minutes."""
        self._comparisons += len(known)
        if self._comparisons > COMPARISONS:
            return f"no {what} is called '{shortened(found)}'{hint}"
        return unknown(what, found, known).message + hint

    def refuse(self, folder: str) -> None:
        """Raises FaultyRows with every fault, in the order of files and lines, if there is any."""
        if self._found:
            said = [text for _, _, text in sorted(self._found, key=lambda fault: fault[:2])]
            count = "1 fault" if len(said) == 1 else f"{len(said)} faults"
            raise FaultyRows(f"{count} in {folder}; nothing was imported", said, "correct them and import again")


def printable(text: str) -> str:
    """Bytes that are not UTF-8 came in as lone surrogates, which no terminal takes."""
    return text.encode("utf-8", "replace").decode("utf-8")
