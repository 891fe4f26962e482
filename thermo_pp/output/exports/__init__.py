"""Exports: the data of a report in formats that other libraries open.

``ase_rows`` a database for `ase.db`, ``qcschema`` a document for each calculation; the gas phase for
Cantera is `thermo_pp.output.cantera_phase`. ``structures`` finds what they are made of.
"""

from thermo_pp.output.exports.folder import write_exports

__all__ = ["write_exports"]
