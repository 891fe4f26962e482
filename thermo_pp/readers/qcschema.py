"""QCSchema JSON: energy, gradient and Hessian results of version 1 and 2.

The schema is that of the Molecular Sciences Software Institute, as QCElemental 0.51 and Psi4 write
it. Lengths are in bohr, energies in hartree. A Hessian is diagonalised here, translations and
rotations projected out; a gradient may stand beside it as `properties.return_gradient`.
"""

from __future__ import annotations

import re
import reprlib

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import ISOTOPES, MOST_ABUNDANT, NUMBERS, SYMBOLS
from thermo_pp.formulas.normal_modes import NormalModes, normal_modes
from thermo_pp.names import Origin
from thermo_pp.readers import repulsion
from thermo_pp.readers.json_document import Document, decode
from thermo_pp.readers.text import Text
from thermo_pp.records import Calculation
from thermo_pp.sources import Source
from thermo_pp.units import BOHR_ANGSTROM

NAME = "qcschema"
LOOKS_FOR = 'a JSON object with a "schema_name" of QCSchema'

FloatArray = NDArray[np.float64]

RESULTS = ("qcschema_output", "qc_schema_output", "qcschema_atomic_result")
"""Names of results; inputs, molecules and optimisations are not results of one structure."""
VERSIONS = (1, 2)
DRIVERS = {"energy": "energy", "gradient": "gradient", "hessian": "frequencies"}
TOTALS = {
    "HF": "scf_total_energy",
    "MP2": "mp2_total_energy",
    "CCSD": "ccsd_total_energy",
    "CCSD(T)": "ccsd_prt_pr_total_energy",
}
"""Which property is the total energy of a method; it must agree with `return_energy`."""
EXCITED = ("EOM-", "SF-", "ADC", "TD-", "TDSCF", "TDDFT", "LR-")
"""How the names of methods for excited states begin."""

_SNIFF = re.compile(rb'"schema_name"\s*:\s*"qc_?schema')
_MEND = "write the result again with the program that made it, as JSON of QCSchema version 1 or 2"
_AGREE_HARTREE = 1e-7
_ASYMMETRY = 1e-4
_ROUNDING_ANGSTROM = 1e-6
"""Documents round coordinates to eight decimals of a bohr, or less."""


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is a QCSchema document."""
    return head.removeprefix(b"\xef\xbb\xbf").lstrip()[:1] == b"{" and bool(_SNIFF.search(head))


def read(source: Source) -> Calculation:
    """Read one result.

    Raises
    ------
    ReadError
        Broken JSON (NaN, numbers that are not finite, a key twice, nesting too deep), a failed
        calculation, a key that is missing or of another type, an energy that disagrees with that of
        its method, a Hessian that is not symmetric.
    """
    document = decode(Text(source), mend=_MEND)
    _check_success(document)
    version_2 = document.get("schema_name") == "qcschema_atomic_result"
    specification = ("input_data", "specification") if version_2 else ()
    driver = document.word(*specification, "driver")
    if driver not in DRIVERS:
        raise document.error(
            (*specification, "driver"),
            f"driver {driver!r} is none of {', '.join(DRIVERS)}",
            mend="give the result of an energy, a gradient or a Hessian",
        )
    method = document.word(*specification, "model", "method").upper()
    method = "HF" if method == "SCF" else method
    numbers, positions = _geometry(document)
    _check_repulsion(document, numbers, positions)
    masses, origin = _masses(document, numbers)
    if method.startswith(EXCITED):
        raise document.error(
            (*specification, "model", "method"),
            f"{method}: the energy of an excited state",
            mend="give the result of the ground state",
        )
    energy, energy_keys = _energy(document, driver, method)
    modes = hessian = None
    if driver == "hessian":
        hessian = document.array(9 * len(numbers) ** 2, "return_result")
        hessian = hessian.reshape(3 * len(numbers), -1)
        modes = _modes(document, hessian, masses, positions)
    gradient, gradient_keys = _gradient(document, driver, len(numbers))
    versioned = document.get("provenance", "version") is not None
    places = {
        "method": (*specification, "model", "method"),
        "basis": (*specification, "model", "basis"),
        "energy_hartree": energy_keys,
        "positions_angstrom": ("molecule", "geometry"),
        "masses_u": ("molecule", "masses"),
        "charge": ("molecule", "molecular_charge"),
        "multiplicity": ("molecule", "molecular_multiplicity"),
        "program_version": ("provenance", "version"),
    }
    if modes is not None:
        places["wavenumbers_cm"] = places["hessian_hartree_bohr2"] = ("return_result",)
    if gradient is not None:
        places["gradient_hartree_bohr"] = gradient_keys
    return Calculation(
        path=source.name,
        sha256=source.sha256,
        program=document.word("provenance", "creator"),
        program_version=document.word("provenance", "version") if versioned else None,
        method=method,
        basis=_basis(document, specification),
        frozen_core=_frozen_core(document, specification, method),
        numbers=numbers,
        positions_angstrom=positions,
        masses_u=masses,
        masses_origin=origin,
        charge=document.whole("molecule", "molecular_charge"),
        multiplicity=document.whole("molecule", "molecular_multiplicity"),
        energy_hartree=energy,
        energy_label=_label(document, method),
        wavenumbers_cm=None if modes is None else modes.wavenumbers_cm,
        modes=None if modes is None else modes.modes,
        hessian_hartree_bohr2=hessian,
        gradient_hartree_bohr=gradient,
        kind_of_job=(DRIVERS[driver],),
        where={
            name: document.line(*keys)
            for name, keys in places.items()
            if document.get(*keys) is not None
        },
    )


def _check_success(document: Document) -> None:
    """Refuse a failed calculation and documents that are no results."""
    if document.get("success") is False:
        raise document.error(
            ("success",),
            f"the calculation failed: {_reason(document)[:200]}",
            mend="mend the calculation and rerun it",
        )
    schema = document.word("schema_name")
    version = document.whole("schema_version")
    if schema not in RESULTS:
        raise document.error(
            ("schema_name",),
            f"a document {schema!r}, not a result",
            mend=f"give one of {', '.join(RESULTS)}",
        )
    if version not in VERSIONS:
        raise document.error(
            ("schema_version",),
            f"schema_version {version} is none of {', '.join(map(str, VERSIONS))}",
            mend=_MEND,
        )
    if document.need("success") is not True:
        raise document.error(("success",), "success is neither true nor false")


def _reason(document: Document) -> str:
    """Return the line of the error's text that names the error."""
    message = document.get("error", "error_message") or document.get("error")
    lines = str(message or "no reason given").strip().splitlines()
    named = [
        line for line in lines if re.match(r"[\w.]*(?:Error|Exception|exceptions\.\w+):", line)
    ]
    return (named or lines[-1:])[0].strip()


def _geometry(document: Document) -> tuple[NDArray[np.int64], FloatArray]:
    keys = ("molecule", "symbols")
    symbols = document.items(*keys)
    if not symbols:
        raise document.error(keys, "molecule.symbols is empty")
    unknown = [
        one for one in symbols if not isinstance(one, str) or one.capitalize() not in NUMBERS
    ]
    if unknown:
        raise document.error(keys, f"{reprlib.repr(unknown[0])} in molecule.symbols is no element")
    real = document.get("molecule", "real")
    if real is not None and not (isinstance(real, list) and all(one is True for one in real)):
        raise document.error(
            ("molecule", "real"),
            "a ghost atom: the energy is not that of this molecule alone",
            mend="give the result of the molecule without ghost atoms",
        )
    positions = document.array(3 * len(symbols), "molecule", "geometry").reshape(-1, 3)
    return np.array([NUMBERS[one.capitalize()] for one in symbols]), positions * BOHR_ANGSTROM


def _masses(document: Document, numbers: NDArray[np.int64]) -> tuple[FloatArray, Origin]:
    """Return the masses given, else those of the isotopes given, else of the most abundant ones.

    The last is what the schema lays down.
    """
    if document.get("molecule", "masses") is not None:
        masses = document.array(len(numbers), "molecule", "masses")
        if np.any(masses <= 0.0):
            raise document.error(("molecule", "masses"), "a mass that is not above 0")
        return masses, "printed"
    isotopes = np.array([MOST_ABUNDANT[z] for z in numbers])
    if document.get("molecule", "mass_numbers") is not None:
        given = document.array(len(numbers), "molecule", "mass_numbers")
        isotopes = np.where(given > 0, np.clip(given, 0, 999).astype(np.int64), isotopes)
    masses_u = []
    for z, isotope in zip(numbers, isotopes, strict=True):
        mass = ISOTOPES[SYMBOLS[z]].get(int(isotope))
        if mass is None:
            raise document.error(("molecule", "mass_numbers"), f"no isotope {SYMBOLS[z]}-{isotope}")
        masses_u.append(mass)
    return np.array(masses_u), "derived"


def _energy(document: Document, driver: str, method: str) -> tuple[float, tuple[str, ...]]:
    """Return the energy and where it stands: the method's own, as the schema's `return_energy`."""
    returned, total = ("properties", "return_energy"), ("properties", TOTALS.get(method, ""))
    keys: list[tuple[str, ...]] = [returned] if document.get(*returned) is not None else []
    if driver == "energy":
        keys.append(("return_result",))
    if document.get(*total) is not None:
        keys.append(total)
    if not keys:
        raise document.error(returned, "the key properties.return_energy is missing")
    energies = [document.number(*one) for one in keys]
    for one, energy in zip(keys, energies, strict=True):
        if abs(energy - energies[0]) > _AGREE_HARTREE:
            raise document.error(
                one,
                f"{'.'.join(one)} is {energy!r}, but {'.'.join(keys[0])} is {energies[0]!r}",
                mend="the energy of the method is in doubt; look into the program's own output",
            )
    if method not in TOTALS and document.get("properties", "scf_xc_energy") is None:
        for name, key in TOTALS.items():
            value = document.get("properties", key)
            if name != "HF" and isinstance(value, float) and value == energies[0]:
                raise document.error(
                    ("properties", key),
                    f"the energy is that of {name}, but model.method is {method!r}",
                    mend="the document is damaged; write it again",
                )
    return energies[0], keys[0]


def _gradient(
    document: Document, driver: str, atoms: int
) -> tuple[FloatArray | None, tuple[str, ...]]:
    """Return the gradient and where it stands: the result, or a property beside a Hessian."""
    keys = ("return_result",) if driver == "gradient" else ("properties", "return_gradient")
    if document.get(*keys) is None:
        return None, keys
    return document.array(3 * atoms, *keys).reshape(-1, 3), keys


def _check_repulsion(document: Document, numbers: NDArray[np.int64], positions: FloatArray) -> None:
    """Check atoms and places against the nuclear repulsion, where all electrons are counted."""
    keys = ("properties", "nuclear_repulsion_energy")
    told = [("properties", "calcinfo_nalpha"), ("properties", "calcinfo_nbeta")]
    if any(document.get(*one) is None for one in (keys, *told)):
        return
    charge = document.whole("molecule", "molecular_charge") or 0
    if sum(document.whole(*one) or 0 for one in told) != int(numbers.sum()) - charge:
        return  # effective core potentials, or a method of valence electrons
    why = repulsion.differs(repr(document.number(*keys)), numbers, positions, _ROUNDING_ANGSTROM)
    if why is not None:
        raise document.error(keys, why, mend="the document is damaged; write it again")


def _label(document: Document, method: str) -> str:
    if document.get("properties", "scf_xc_energy") is not None and method not in TOTALS:
        return "DFT"
    return method


def _frozen_core(document: Document, specification: tuple[str, ...], method: str) -> str | None:
    """Return "frozen" or "none" as the keyword of Psi4 says, None where it is not given."""
    frozen = document.get(*specification, "keywords", "freeze_core")
    if method == "HF" or not isinstance(frozen, bool):
        return None
    return "frozen" if frozen else "none"


def _basis(document: Document, specification: tuple[str, ...]) -> str | None:
    basis = document.get(*specification, "model", "basis")
    name = basis.get("name") if isinstance(basis, dict) else basis
    return name if isinstance(name, str) and name else None


def _modes(
    document: Document, hessian: FloatArray, masses: FloatArray, positions: FloatArray
) -> NormalModes:
    keys = ("return_result",)
    if np.max(np.abs(hessian - hessian.T)) > _ASYMMETRY:
        raise document.error(keys, "the Hessian is not symmetric")
    try:
        with np.errstate(all="ignore"):
            found = normal_modes(hessian, masses, positions)
    except ValueError as error:
        raise document.error(keys, f"the Hessian: {error}") from None
    if not (np.all(np.isfinite(found.wavenumbers_cm)) and np.all(np.isfinite(found.modes))):
        raise document.error(keys, "the Hessian has wavenumbers that are not finite")
    return found
