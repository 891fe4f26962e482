"""The outputs of a study: each is read once."""

from __future__ import annotations

import os
from dataclasses import dataclass, field
from pathlib import Path

from thermo_pp.errors import StudyError
from thermo_pp.readers import read_all, read_source
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source
from thermo_pp.study.check import place
from thermo_pp.study.files import inside


@dataclass(frozen=True, eq=False)
class Outputs:
    """The outputs that the species of a study name.

    Attributes
    ----------
    folder : Path
        Of the outputs; their names start from it.
    within : Path
        Folder of the study file, which no output may lie outside of.
    read : dict of str to Calculation
        By path: those read for this study, and those that were read before.
    opened : dict of str to Calculation
        By path: those that a species or a part of an energy names.
    """

    folder: Path
    within: Path
    read: dict[str, Calculation]
    opened: dict[str, Calculation] = field(default_factory=dict)

    @classmethod
    def of(cls, folder: str, file: str, read: dict[str, Calculation]) -> Outputs:
        """Return the outputs in `folder`, named from the study file `file`.

        Raises
        ------
        StudyError
            There is no such folder.
        """
        within = Path(file).parent
        outputs = within / folder
        if not os.path.isdir(outputs):  # noqa: PTH112 (nor is it a folder)
            raise StudyError(
                f"there is no folder {str(outputs)!r}",
                where=place(file, "outputs"),
                mend="name the folder of the outputs, from the folder of the study file",
            )
        return cls(outputs, within, read)

    def source(self, name: str, where: str) -> Source:
        """Open the file `name`, which the key at `where` names."""
        return open_source(inside(self.folder, self.within, name, where))

    def calculation(self, name: str, where: str) -> Calculation:
        """Read the output `name` once."""
        path = inside(self.folder, self.within, name, where)
        if str(path) not in self.read:
            self.read[str(path)] = read_source(open_source(path))
        self.opened[str(path)] = self.read[str(path)]
        return self.read[str(path)]

    def calculations(self, name: str, where: str) -> tuple[Calculation, ...]:
        """Read every structure of the file `name`."""
        found = read_all(self.source(name, where))
        self.read.update({calc.path: calc for calc in found})
        return found
