"""The keys of one structure, read from outputs or declared."""

from __future__ import annotations

from typing import Annotated, Literal

from msgspec import UNSET, Meta, UnsetType

from thermo_pp.names import NuclearSpins
from thermo_pp.study.keys.base import Keys, Quantity, Whole
from thermo_pp.study.keys.energies import EnergyKeys
from thermo_pp.study.keys.treatment import Imaginary

Levels = Annotated[list[tuple[Whole, Quantity]], Meta(min_length=1)]


class RotationalKeys(Keys, frozen=True, kw_only=True):
    """Rotational constants of a linear molecule: levels B J(J+1) - D J²(J+1)²."""

    B: Annotated[Quantity, Meta(description="rotational constant of the ground state / cm^-1")]
    D: Annotated[Quantity, Meta(description="centrifugal distortion / cm^-1")] = 0.0


class TorsionKeys(Keys, frozen=True, kw_only=True):
    """A torsion treated as a hindered rotor; see ``docs/torsions.md``."""

    atoms: Annotated[
        tuple[Whole, Whole, Whole, Whole],
        Meta(
            description="four atoms of the dihedral angle, counted from 1, each bonded to the next"
        ),
    ]
    scan: Annotated[
        str | Annotated[list[str], Meta(min_length=1)] | UnsetType,
        Meta(
            description="relaxed scan: a table (CSV) with the columns `angle / deg` and "
            "`energy / kJ mol^-1` (or another unit), or a list of outputs, one a point; a torsion has "
            "this or `fourier`"
        ),
    ] = UNSET
    fourier: Annotated[
        list[tuple[Whole, Quantity, Quantity]] | UnsetType,
        Meta(
            description="potential as a series of c cos(k x) + s sin(k x), "
            '`[[3, "6 kJ/mol", 0]]` (k, c, s) / kJ/mol'
        ),
    ] = UNSET
    symmetry_number: Annotated[
        Whole | UnsetType,
        Meta(
            description="wells of the circle that like atoms make the same (3 for a methyl group); "
            "found by turning the top unless given"
        ),
    ] = UNSET
    mirror: Annotated[
        Quantity | UnsetType,
        Meta(
            description="the potential is the same to both sides of this angle: half a period is "
            "enough / deg"
        ),
    ] = UNSET
    reduced_moment: Annotated[
        Quantity | UnsetType,
        Meta(
            description="reduced moment of inertia; that of the geometry unless given / u*angstrom^2"
        ),
    ] = UNSET
    mode: Annotated[
        Whole | str | UnsetType,
        Meta(
            description="the mode that it stands for, its number (from 1) or its wavenumber; found "
            "by overlap unless given"
        ),
    ] = UNSET


Vectors = Annotated[list[tuple[Quantity, Quantity, Quantity]], Meta(min_length=1)]


class SeamKeys(Keys, frozen=True, kw_only=True):
    """The other spin state at a crossing point, so that the modes along the seam can be worked out."""

    other: Annotated[
        str | UnsetType,
        Meta(
            description="output of the other state at the same geometry, best its frequency job; or "
            "`gradient_difference`"
        ),
    ] = UNSET
    gradients: Annotated[
        tuple[str | Vectors, str | Vectors] | UnsetType,
        Meta(
            description="gradients of the state of `frequencies` and of `other`, where these outputs do "
            "not hold them: outputs, or three numbers an atom in the order and orientation of "
            "`frequencies` / hartree/bohr"
        ),
    ] = UNSET
    gradient_difference: Annotated[
        Vectors | UnsetType,
        Meta(
            description="gradient of the state of `frequencies` less that of the other one, three "
            "numbers an atom, where nothing else is known of the other state / hartree/bohr"
        ),
    ] = UNSET
    multiplicity: Annotated[
        Whole | UnsetType,
        Meta(
            description="spin multiplicity of the other state, where its output does not say it, or where "
            "both states have the same"
        ),
    ] = UNSET


class StructureKeys(Keys, frozen=True, kw_only=True):
    """One structure, read from outputs or declared: what a species and a conformer have."""

    frequencies: Annotated[
        str | UnsetType,
        Meta(
            description="output of the frequency job; a species has this, `conformers` or "
            "`composition`"
        ),
    ] = UNSET
    energy: Annotated[
        str | EnergyKeys | UnsetType,
        Meta(
            description="output of a single point at the same geometry, whose energy is used, or a "
            "table of parts; the frequency job's own energy unless given"
        ),
    ] = UNSET
    charge: Annotated[
        int | UnsetType, Meta(description="charge, where the output does not say it")
    ] = UNSET
    multiplicity: Annotated[
        Whole | UnsetType,
        Meta(description="spin multiplicity, where the output does not say it"),
    ] = UNSET
    levels: Annotated[
        Levels | Literal["table"] | UnsetType,
        Meta(
            description="electronic levels in place of the multiplicity, "
            '`[[5, "0 cm^-1"], [3, "158.265 cm^-1"]]` (degeneracy, energy / cm^-1); "table" takes '
            "those of a few atoms and radicals that come with the program",
        ),
    ] = UNSET
    symmetry_number: Annotated[
        Whole | UnsetType,
        Meta(description="rotational symmetry number; found from the geometry unless given"),
    ] = UNSET
    isotopes: Annotated[
        dict[str, str] | UnsetType,
        Meta(
            description="atom (counted from 1, in the order of the output) or element -> isotope: "
            '`{ 3 = "D", C = "13C" }`; needs a Hessian'
        ),
    ] = UNSET
    rotational_constants: Annotated[
        RotationalKeys | UnsetType,
        Meta(description="of a linear molecule, whose levels are summed then"),
    ] = UNSET
    nuclear_spins: Annotated[
        NuclearSpins | UnsetType,
        Meta(
            description='of H2, D2 and T2: "equilibrium" unless given; "normal", "ortho" or "para" '
            "where the kinds do not turn into each other"
        ),
    ] = UNSET
    torsions: Annotated[
        list[TorsionKeys] | UnsetType,
        Meta(
            description='torsions treated as hindered rotors: `[{ atoms = [1, 2, 3, 4], scan = "scan.csv" }]`'
        ),
    ] = UNSET
    seam: Annotated[
        SeamKeys | UnsetType,
        Meta(
            description='of a point that a step of kind "crossing" goes through: the other spin state, '
            '`{ other = "triplet.out" }`'
        ),
    ] = UNSET
    imaginary: Annotated[
        Imaginary | UnsetType, Meta(description="as in `[treatment]`, for this species alone")
    ] = UNSET
    composition: Annotated[
        str | UnsetType,
        Meta(
            description="formula of a declared species, its charge at the end: "
            '"H2SO4", "H3O+", "SO4^2-"'
        ),
    ] = UNSET
    enthalpy: Annotated[
        Quantity | UnsetType,
        Meta(description="enthalpy of a declared species, required for one / kJ/mol"),
    ] = UNSET
    entropy: Annotated[
        Quantity | UnsetType,
        Meta(
            description="entropy of a declared species at its standard state, required for one; "
            "may be negative / J/mol/K"
        ),
    ] = UNSET
    heat_capacity: Annotated[
        Quantity | UnsetType,
        Meta(
            description="heat capacity of a declared species; without it enthalpy and entropy are "
            "constant in temperature / J/mol/K"
        ),
    ] = UNSET
    temperature: Annotated[
        Quantity | UnsetType,
        Meta(
            description="where enthalpy and entropy of a declared species hold, 298.15 K unless "
            "given; matters only with `heat_capacity` / K"
        ),
    ] = UNSET
    ground: Annotated[
        Quantity | UnsetType,
        Meta(
            description="enthalpy of a declared species at 0 K, on the same zero as `enthalpy`; only "
            'tunnelling = "eckart" needs it / kJ/mol'
        ),
    ] = UNSET
    imaginary_mode: Annotated[
        Quantity | UnsetType,
        Meta(
            description="size of the imaginary wavenumber of a declared saddle point; only tunnelling "
            "needs it / cm^-1"
        ),
    ] = UNSET
