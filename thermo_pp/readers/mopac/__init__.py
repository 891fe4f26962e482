"""MOPAC: the text output and the AUX file, of single points, optimisations and FORCE jobs.

Which energy
- The energy is MOPAC's total energy (electronic energy and core repulsion, eV on the method's own
  scale), where the file has it: ``TOTAL ENERGY``, ``ETOT`` of ENPART, ``TOTAL_ENERGY:EV`` of AUX.
- The heat of formation is no electronic energy: it is an enthalpy at 298 K by parametrisation, with
  zero-point and thermal energy in it, so adding them again would count them twice. It is kept in
  `printed` (``heat_of_formation``) and never in `energy_hartree`. A file with nothing else has no
  energy, and a finding says what to do. MOPAC 22 prints a total energy with ENPART only.
- Dispersion and hydrogen-bond terms that are added to the heat of formation (PM6-D3H4, PM7) are not
  sure to be in the total energy.

Traps
- Translations and rotations stand last among the frequencies (by position, not by size: up to
  hundreds of cm^-1, negative too, where the geometry is not stationary).
- ``DESCRIPTION OF VIBRATIONS`` leaves out all but the last mode of a degenerate set.
- ``ISOTOPIC_MASSES`` are average masses, unless the input changed them.
- ENTHALPY in THERMO has no zero-point energy in it; the heat capacity is Cp; the pressure is 1 atm
  and not printed.
- ``JOB ENDED NORMALLY`` stands at the end of failed jobs too.
- The printed geometry of a FORCE job has four decimals where the input is a Z-matrix.

Formats were checked on MOPAC 22.0.6, and looked at for MOPAC2016.
"""

from __future__ import annotations

from thermo_pp.readers.mopac import aux_file, output
from thermo_pp.records import Calculation
from thermo_pp.sources import Source

__all__ = ["LOOKS_FOR", "NAME", "read", "sniff"]

NAME = "mopac"
LOOKS_FOR = "MOPAC's 'CALCULATION RESULTS' and banner, or 'START OF MOPAC FILE' of an AUX file"


def sniff(head: bytes) -> bool:
    """Tell whether `head`, the first 64 KiB of a file, is this program's."""
    return aux_file.sniff(head) or output.sniff(head)


def read(source: Source) -> Calculation:
    """Read one output or AUX file.

    Raises
    ------
    ReadError
        A job that failed or did not end, several jobs in an AUX file, excited states, values
        printed twice that differ, anything damaged.
    """
    if aux_file.sniff(source.head):
        return aux_file.read(source)
    return output.read(source)
