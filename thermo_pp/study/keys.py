"""The keys of the study file: one model, from which schema, docs and every check follow."""

from __future__ import annotations

from typing import Annotated, Any, Literal

import msgspec
from msgspec import UNSET, Meta, UnsetType

from thermo_pp.names import (
    DEFAULT_LOW_MODES,
    DEFAULT_ONSET_CM,
    DEFAULT_STANDARD_STATE,
    Broadening,
    Constant,
    Duplicates,
    LowModes,
    Masses,
    NuclearSpins,
    Phase,
    Reference,
    Rotor,
    SelectivityKind,
    Thermal,
    Tunnelling,
)

Quantity = str | float
"""A text of one number and its unit; a bare number is in the unit that the docs name."""


Positive = Annotated[float, Meta(gt=0.0)]
Whole = Annotated[int, Meta(ge=1)]
Correlation = Annotated[float, Meta(ge=-1.0, le=1.0)]
Levels = Annotated[list[tuple[Whole, Quantity]], Meta(min_length=1)]
Pairs = Annotated[list[tuple[Quantity, Quantity]], Meta(min_length=1)]


class Keys(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    """A table of the file: unknown keys are refused."""


class RealBelowKeys(Keys, frozen=True, kw_only=True):
    """What is done with a small imaginary mode."""

    real_below: Annotated[
        Quantity, Meta(description="imaginary modes smaller than this are taken as real / cm^-1")
    ]


Imaginary = Literal["refuse"] | RealBelowKeys


class TreatmentKeys(Keys, frozen=True, kw_only=True):
    """How a structure becomes H, S and G."""

    standard_state: Annotated[
        str, Meta(description='a pressure or a concentration: "1 bar", "1 atm", "1 mol/L"')
    ] = DEFAULT_STANDARD_STATE
    phase: Annotated[Phase, Meta(description='"gas" or "solution"')] = "gas"
    low_modes: Annotated[
        LowModes,
        Meta(
            description='soft modes: "harmonic", "raised", "rotor-entropy" or "rotor-enthalpy"',
        ),
    ] = DEFAULT_LOW_MODES
    onset: Annotated[
        Quantity, Meta(description="where the treatment of soft modes sets in / cm^-1")
    ] = f"{DEFAULT_ONSET_CM:g} cm^-1"
    rotor: Annotated[
        Rotor,
        Meta(
            description='"auto": quantum rotor where that changes G by more than 0.01 kJ/mol; '
            '"classical": never'
        ),
    ] = "auto"
    masses: Annotated[
        Masses, Meta(description='"program": those the calculation used; "average": of the element')
    ] = "program"
    imaginary: Annotated[
        Imaginary,
        Meta(
            description="imaginary modes that should not be there: refused, or "
            '`{ real_below = "30 cm^-1" }` takes smaller ones as real'
        ),
    ] = "refuse"
    frequency_scale: Annotated[
        Positive, Meta(description="factor of the wavenumbers in thermal terms")
    ] = 1.0
    zero_point_scale: Annotated[
        Positive | UnsetType,
        Meta(
            description="factor of the wavenumbers in the zero-point energy; "
            "the same as `frequency_scale` unless given",
        ),
    ] = UNSET
    tunnelling: Annotated[
        Tunnelling,
        Meta(description="of every step with a saddle point that does not say it itself"),
    ] = "none"
    tunnelling_scale: Annotated[
        Positive | UnsetType,
        Meta(
            description="factor of the imaginary wavenumber in tunnelling; "
            "the same as `frequency_scale` unless given",
        ),
    ] = UNSET
    enantiopure: Annotated[
        bool, Meta(description="true: only one hand of every chiral structure is present")
    ] = False
    entropy_correction: Annotated[
        Quantity | UnsetType,
        Meta(
            description="in solution only: added to the entropy of every species that is read; "
            "none unless given / J/mol/K"
        ),
    ] = UNSET
    duplicates: Annotated[
        Duplicates,
        Meta(
            description='a conformer that is listed twice: "count" it twice, with a finding, or "once"'
        ),
    ] = "count"


class RangeKeys(Keys, frozen=True, kw_only=True, rename={"from_": "from"}):
    """A range of temperatures."""

    from_: Annotated[Quantity, Meta(description="first temperature / K")]
    to: Annotated[Quantity, Meta(description="last temperature, included / K")]
    step: Annotated[
        Quantity, Meta(description="width, which must divide the range; kelvin only / K")
    ]


Temperatures = Annotated[list[Quantity], Meta(min_length=1)] | RangeKeys


class FlowKeys(Keys, frozen=True, kw_only=True):
    """A stirred tank that flows."""

    residence_time: Annotated[Quantity, Meta(description="residence time / s")]
    feed: Annotated[
        dict[str, str],
        Meta(
            min_length=1, description="species -> concentration or partial pressure that flows in"
        ),
    ]


class ConditionsKeys(Keys, frozen=True, kw_only=True):
    """Temperatures, and what is held constant."""

    temperatures: Annotated[
        Temperatures | UnsetType,
        Meta(
            description="a list, its order kept, each once, or a range `{ from, to, step }`; "
            "required unless the command line gives temperatures / K"
        ),
    ] = UNSET
    held: Annotated[
        dict[str, str],
        Meta(
            description="species -> free concentration that stays constant: a concentration, "
            'a partial pressure or a mole fraction ("400 ppm", "21 %", "0.21 mol/mol"; gas only), '
            '"pH 7", electrons at a potential ("-0.4 V"), or "equilibrium" with those held at '
            "stated values"
        ),
    ] = {}
    total_pressure: Annotated[
        Quantity | UnsetType,
        Meta(description="of the whole gas; mole fractions and the collider M need it / Pa"),
    ] = UNSET
    constant: Annotated[
        Constant | UnsetType,
        Meta(
            description='"concentration" or "pressure": what of a gas stays when the temperature '
            "changes; the form in which each amount is stated unless given"
        ),
    ] = UNSET
    stated_at: Annotated[
        Quantity | UnsetType,
        Meta(
            description="the temperature at which amounts hold that are stated in the other form "
            "than `constant` / K"
        ),
    ] = UNSET
    driven: Annotated[
        bool, Meta(description="true: held species may be out of balance with each other")
    ] = False
    initial: Annotated[
        dict[str, str],
        Meta(
            description="species -> concentration or partial pressure at the start of a time course "
            "(`barrier --time`); what is not named is not there"
        ),
    ] = {}
    total: Annotated[
        dict[str, str],
        Meta(
            description="catalyst -> concentration of all its forms together, needed where some hold "
            "it twice (dimers) or meet each other"
        ),
    ] = {}
    flow: Annotated[
        FlowKeys | UnsetType,
        Meta(description="a stirred tank that flows: its steady state is worked out"),
    ] = UNSET
    quasi_steady: Annotated[
        list[str],
        Meta(description="species whose quasi-steady state is set beside the time course"),
    ] = []


class RotationalKeys(Keys, frozen=True, kw_only=True):
    """Rotational constants of a linear molecule: levels B J(J+1) - D J²(J+1)²."""

    B: Annotated[Quantity, Meta(description="rotational constant of the ground state / cm^-1")]
    D: Annotated[Quantity, Meta(description="centrifugal distortion / cm^-1")] = 0.0


class SumKeys(Keys, frozen=True, kw_only=True):
    """One single point of a sum."""

    file: Annotated[str, Meta(description="output at the geometry of the frequency job")]
    method: Annotated[
        str | UnsetType,
        Meta(
            description='which energy of the file: "HF", "MP2", "CCSD(T)"; its best one unless '
            "given"
        ),
    ] = UNSET
    factor: Annotated[float, Meta(description="sign and factor; those of a sum add up to 1")] = 1.0


class ExtrapolateKeys(Keys, frozen=True, kw_only=True):
    """Reference and correlation energy at the limit of the basis set, from two outputs."""

    files: Annotated[
        tuple[str, str],
        Meta(description="outputs of one correlated method, that in the smaller basis set first"),
    ]
    method: Annotated[
        str | UnsetType, Meta(description="which energy of the files; their best one unless given")
    ] = UNSET
    correlation: Annotated[
        Literal["X^-3"] | Positive,
        Meta(
            description='how the correlation energy falls off with the cardinal number: "X^-3", or '
            "another power as a number: 2.4 is X^-2.4"
        ),
    ]
    reference: Annotated[
        Reference,
        Meta(
            description='how the Hartree-Fock energy falls off: "exp(-1.63 X)" or '
            '"(X+1) exp(-9 sqrt X)"; "largest": that of the larger basis set is taken'
        ),
    ]
    cardinals: Annotated[
        tuple[Whole, Whole] | UnsetType,
        Meta(
            description="cardinal numbers of the files, needed unless the basis sets are "
            "correlation-consistent and named"
        ),
    ] = UNSET


class SolvationKeys(Keys, frozen=True, kw_only=True):
    """Free energy from gas to solution: from two outputs at one geometry, or declared."""

    solvent: Annotated[
        str | UnsetType,
        Meta(description="output with the solvent model; this and `gas`, or `value`"),
    ] = UNSET
    gas: Annotated[str | UnsetType, Meta(description="output without it, else alike")] = UNSET
    value: Annotated[
        Quantity | UnsetType, Meta(description="a declared free energy of solvation / kJ/mol")
    ] = UNSET
    gas_state: Annotated[
        str | UnsetType,
        Meta(
            description='standard state of the gas that `value` starts from, "1 bar" or "1 mol/L"; '
            "it ends at 1 mol/L; required with `value`"
        ),
    ] = UNSET
    slope: Annotated[
        Quantity | UnsetType,
        Meta(description="temperature derivative of the term; a finding without it / J/mol/K"),
    ] = UNSET
    temperature: Annotated[
        Quantity | UnsetType,
        Meta(description="where the term holds, 298.15 K unless given / K"),
    ] = UNSET


class FragmentKeys(Keys, frozen=True, kw_only=True):
    """One fragment of a complex, for its counterpoise term."""

    atoms: Annotated[
        list[Whole],
        Meta(
            min_length=1,
            description="atoms of the complex (from 1, in the order of its frequency job)",
        ),
    ]
    own: Annotated[str, Meta(description="output of the fragment alone, as it is in the complex")]
    ghosts: Annotated[
        str, Meta(description="the same with the basis functions of the whole complex")
    ]


class EnergyKeys(Keys, frozen=True, kw_only=True):
    """An electronic energy of several parts."""

    sum: Annotated[
        Annotated[list[SumKeys], Meta(min_length=1)] | UnsetType,
        Meta(
            description='single points with their factors, `[{ file = "a.out" }, '
            '{ file = "b.out", factor = -1 }, ...]`',
        ),
    ] = UNSET
    extrapolate: Annotated[
        ExtrapolateKeys | UnsetType,
        Meta(description="limit of the basis set from two outputs; it counts as factor 1"),
    ] = UNSET
    solvation: Annotated[
        SolvationKeys | UnsetType,
        Meta(description="free energy of solvation, 1 mol/L to 1 mol/L; in solution only"),
    ] = UNSET
    counterpoise: Annotated[
        Quantity | list[FragmentKeys] | UnsetType,
        Meta(
            description="of a complex: its fragments, or a declared value, which is added / kJ/mol"
        ),
    ] = UNSET


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


class ConformerKeys(StructureKeys, frozen=True, kw_only=True):
    """One conformer of a species."""

    degeneracy: Annotated[
        Whole | UnsetType,
        Meta(
            description="how often this conformer is there; 2 for a chiral one whose mirror image is "
            "not listed, else 1, unless given"
        ),
    ] = UNSET


class ConformerFileKeys(Keys, frozen=True, kw_only=True):
    """Conformers that stand in one file."""

    ensemble: Annotated[
        str,
        Meta(
            description="file of several structures with their energies: extended XYZ, a trajectory "
            "or a data base of ASE; every structure is a conformer"
        ),
    ]


_ConformerTable = Annotated[
    ConformerKeys,
    Meta(
        extra_json_schema={
            "anyOf": [
                {"required": ["frequencies"]},
                {"required": ["energy"]},
                {"required": ["composition", "enthalpy", "entropy"]},
            ]
        }
    ),
]
Conformers = Annotated[list[_ConformerTable], Meta(min_length=1)] | ConformerFileKeys


class SpeciesKeys(StructureKeys, frozen=True, kw_only=True):
    """One species, saddle points included: read from outputs, or declared."""

    conformers: Annotated[
        Conformers | UnsetType,
        Meta(
            description="a table for every conformer, "
            '`[{ frequencies = "a.out" }, { frequencies = "b.out" }]`, or `{ ensemble = "many.xyz" }`; '
            "what the species says of charge, multiplicity, levels, symmetry number, isotopes and "
            "imaginary modes holds for each that does not say it itself"
        ),
    ] = UNSET
    thermal: Annotated[
        Thermal,
        Meta(
            description='"own": every conformer has frequencies; "nearest": one without takes the '
            "wavenumbers of the conformer nearest in shape"
        ),
    ] = "own"
    spin_states: Annotated[
        bool, Meta(description="true: the conformers may be different spin states in equilibrium")
    ] = False
    standard_state: Annotated[
        str | UnsetType, Meta(description="as in `[treatment]`, for this species alone")
    ] = UNSET
    entropy_correction: Annotated[
        Quantity | UnsetType, Meta(description="as in `[treatment]`, for this species alone")
    ] = UNSET
    deviation: Annotated[
        Quantity | UnsetType,
        Meta(description="standard deviation of the energy in place of that of `[doubt]` / kJ/mol"),
    ] = UNSET
    relative_to: Annotated[
        dict[str, int] | UnsetType,
        Meta(
            description="`{ A = 1, W = 1 }`: enthalpy, entropy and heat capacity of a declared "
            "species are differences from this sum; required beside species that are read"
        ),
    ] = UNSET


class LevelKeys(Keys, frozen=True, kw_only=True):
    """A named level of theory: an energy for every species that is read."""

    energy: Annotated[
        str | EnergyKeys | UnsetType,
        Meta(
            description="as in `[species.NAME]`, for every species: `{frequencies}` in a file name "
            "stands for the species' frequency job without its ending, `{species}` for its name"
        ),
    ] = UNSET
    energies: Annotated[
        dict[str, str | EnergyKeys],
        Meta(description="as in `[species.NAME]`, by species; before `energy`"),
    ] = {}


class ArrheniusKeys(Keys, frozen=True, kw_only=True):
    """A declared rate constant that depends on temperature: k = A (T/298.15 K)^n exp(-E/RT)."""

    A: Annotated[str, Meta(description="factor, in the unit of the rate constant")]
    n: Annotated[float, Meta(description="power of T/298.15 K")] = 0.0
    E: Annotated[Quantity, Meta(description="energy, may be negative / kJ/mol")]


class ScanKeys(Keys, frozen=True, kw_only=True):
    """The maximum of a scan as the height of a saddle that is not located."""

    scan: Annotated[
        str | Annotated[list[str], Meta(min_length=3)],
        Meta(
            description="outputs, the left side of the step first, or a table (CSV) with a column "
            '"energy / kJ mol^-1"'
        ),
    ]


class FalloffKeys(Keys, frozen=True, kw_only=True):
    """A declared forward rate constant between its limits of low and high pressure."""

    low: Annotated[
        ArrheniusKeys, Meta(description="limit at low pressure, of one order more, as `arrhenius`")
    ]
    high: Annotated[ArrheniusKeys, Meta(description="limit at high pressure, as `arrhenius`")]
    form: Annotated[
        Broadening,
        Meta(
            description='"lindemann" (no centre), "troe" (c = -0.4 - 0.67 log F), "iupac" '
            '(log F/(1 + (log P/N)^2)) or "jpl" (log F/(1 + (log P)^2))'
        ),
    ]
    centre: Annotated[
        float | list[Quantity] | UnsetType,
        Meta(
            description="F_cent, or `[a, T3, T1]` or `[a, T3, T1, T2]` of its dependence on "
            "temperature; required but for lindemann"
        ),
    ] = UNSET
    collider: Annotated[
        str | Annotated[dict[str, Positive], Meta(min_length=1)],
        Meta(
            description='"M" for the whole gas (`total_pressure`), a held species, or efficiencies, '
            "`{ N2 = 1, W = 6 }`"
        ),
    ]


class LandauZenerKeys(Keys, frozen=True, kw_only=True):
    """What the probability to change the spin state follows from."""

    spin_orbit: Annotated[Quantity, Meta(description="spin-orbit coupling at the crossing / cm^-1")]
    gradient_difference: Annotated[
        str, Meta(description='size of the difference of the gradients, "0.05 hartree/bohr"')
    ]
    reduced_mass: Annotated[str, Meta(description='reduced mass along it, "12 u"')]


class CrossingKeys(Keys, frozen=True, kw_only=True):
    """How likely a step changes the spin state at its crossing point."""

    transmission: Annotated[
        Positive | UnsetType, Meta(description="declared probability, at most 1; this or the next")
    ] = UNSET
    landau_zener: Annotated[
        LandauZenerKeys | UnsetType,
        Meta(description="probability by Landau and Zener, averaged over thermal energies"),
    ] = UNSET


class ReactionKeys(Keys, frozen=True, kw_only=True):
    """A measured free energy of one step, in place of the computed one."""

    anchor: Annotated[
        str, Meta(description="the species of the step that is moved until the value is met")
    ]
    free_energy: Annotated[
        Quantity | UnsetType,
        Meta(description="free energy of the step; one of these four / kJ/mol"),
    ] = UNSET
    equilibrium_constant: Annotated[
        str | float | UnsetType,
        Meta(description='"1.7e-5 mol/L", "40 L/mol"; a number where both sides have as many'),
    ] = UNSET
    pKa: Annotated[float | UnsetType, Meta(description="of a step HA = A + H+, in solution")] = (
        UNSET
    )
    potential: Annotated[
        Quantity | UnsetType,
        Meta(
            description="redox potential of a step with electrons on its left side, in solution / V"
        ),
    ] = UNSET
    standard_state: Annotated[
        str | UnsetType,
        Meta(
            description='of `free_energy`, "1 bar" or "1 mol/L"; required where molecules are made'
        ),
    ] = UNSET
    temperature: Annotated[
        Quantity | UnsetType, Meta(description="where the value holds, 298.15 K unless given / K")
    ] = UNSET
    enthalpy: Annotated[
        Quantity | UnsetType,
        Meta(
            description="measured enthalpy of the step; without it the computed entropy stays / kJ/mol"
        ),
    ] = UNSET


class StepKeys(Keys, frozen=True, kw_only=True):
    """One reversible step: exactly one of `through`, `barrier`, `rate`, `arrhenius`, `falloff`."""

    equation: Annotated[
        str, Meta(description='what becomes what, `"SO3 + 2 W = C2"`, spaces around + and counts')
    ]
    through: Annotated[
        str | UnsetType, Meta(description="the saddle point, a species of this file")
    ] = UNSET
    barrier: Annotated[
        Quantity | ScanKeys | UnsetType,
        Meta(
            description='"none": the rate is the collision or diffusion limit of two molecules; or '
            "the height of a saddle that is not located, in free energy above the higher side at "
            '1 mol/L; or `{ scan = "scan.csv" }` / kJ/mol'
        ),
    ] = UNSET
    deviation: Annotated[
        Quantity | UnsetType,
        Meta(
            description="standard deviation of the height in `barrier`; in `[doubt]` that of saddle points "
            "unless given / kJ/mol"
        ),
    ] = UNSET
    rate: Annotated[
        str | UnsetType,
        Meta(
            description="forward rate constant, the same at all temperatures, in the unit that the "
            'left side asks for: "1e9 L/mol/s", "1e-11 cm^3/s", "5 s^-1"'
        ),
    ] = UNSET
    arrhenius: Annotated[
        ArrheniusKeys | UnsetType,
        Meta(
            description="forward rate constant A (T/298.15 K)^n exp(-E/RT): "
            '`{ A = "1e11 L/mol/s", n = 0.5, E = "-2 kJ/mol" }`'
        ),
    ] = UNSET
    falloff: Annotated[
        FalloffKeys | UnsetType,
        Meta(description="forward rate constant between two limits of pressure"),
    ] = UNSET
    viscosity: Annotated[
        Quantity | Pairs | UnsetType,
        Meta(
            description='viscosity for the diffusion limit in solution: "0.89 mPa s", or pairs of '
            "temperature and viscosity / Pa s",
        ),
    ] = UNSET
    permittivity: Annotated[
        Positive | Annotated[list[tuple[Quantity, Positive]], Meta(min_length=1)] | UnsetType,
        Meta(
            description="relative permittivity of the solvent, for two ions that meet: 78.4, or "
            "pairs of temperature and permittivity"
        ),
    ] = UNSET
    kind: Annotated[
        Literal["crossing"] | UnsetType,
        Meta(
            description='"crossing": the step changes the spin state at a minimum-energy crossing '
            "point, which `through` names; needs `crossing`"
        ),
    ] = UNSET
    crossing: Annotated[
        CrossingKeys | UnsetType,
        Meta(
            description='of a step of kind "crossing": `{ transmission = 0.01 }` or `landau_zener`'
        ),
    ] = UNSET
    reaction: Annotated[
        ReactionKeys | UnsetType,
        Meta(
            description="measured free energy of the step, `{ equilibrium_constant = 40, "
            'anchor = "C" }`'
        ),
    ] = UNSET
    tunnelling: Annotated[
        Tunnelling | UnsetType,
        Meta(
            description='"none", "wigner", or "eckart" with the heights from both sides of this '
            "step, zero-point energies included; as in `[treatment]` unless given"
        ),
    ] = UNSET


class CorrelationKeys(Keys, frozen=True, kw_only=True):
    """Correlation of the errors of the energies, from -1 to 1."""

    same_kind: Annotated[
        Correlation,
        Meta(description="of minima with each other, and of saddle points with each other"),
    ] = 0.0
    across: Annotated[Correlation, Meta(description="of minima with saddle points")] = 0.0


class DoubtKeys(Keys, frozen=True, kw_only=True):
    """How sure the energies are; with this table `barrier` shows the doubt about every answer."""

    deviation: Annotated[
        Quantity, Meta(description="standard deviation of the energies of minima / kJ/mol")
    ]
    saddle_deviation: Annotated[
        Quantity | UnsetType,
        Meta(description="of those of saddle points; the same unless given / kJ/mol"),
    ] = UNSET
    correlation: Annotated[
        CorrelationKeys,
        Meta(description="`{ same_kind = 0.5, across = 0.3 }`; 0 unless given"),
    ] = CorrelationKeys()
    pairs: Annotated[
        list[tuple[str, str, Correlation]],
        Meta(
            description='correlation of two energies in place of that of their kinds: `[["A", "TS1", '
            "0.9], ...]`; a step with a height in `barrier` goes under its equation"
        ),
    ] = []
    samples: Annotated[
        Annotated[int, Meta(ge=100, le=1_000_000)],
        Meta(description="how many sets of energies are drawn, 100 to 1000000"),
    ] = 10_000
    seed: Annotated[
        Annotated[int, Meta(ge=0)],
        Meta(description="of the random numbers: the same seed gives the same answer"),
    ] = 1
    alternatives: Annotated[
        bool,
        Meta(
            description="whether every named level of theory and every other choice of treatment is "
            "shown beside"
        ),
    ] = True


class EffectiveKeys(Keys, frozen=True, kw_only=True):
    """The question: from which species to which."""

    reactant: Annotated[
        str | UnsetType, Meta(description="whose loss is asked for; this or `catalyst`")
    ] = UNSET
    catalyst: Annotated[
        str | UnsetType, Meta(description="whose turnover frequency is asked for")
    ] = UNSET
    product: Annotated[
        str | Annotated[list[str], Meta(min_length=1)],
        Meta(description="what is made: one species, or a list"),
    ]


class IsotopologueKeys(Keys, frozen=True, kw_only=True):
    """Isotopes that are put into the species of the study, for isotope effects."""

    all: Annotated[
        dict[str, str],
        Meta(description='element -> isotope, in every species that has it: `{ H = "D" }`'),
    ] = {}
    species: Annotated[
        dict[str, dict[str, str]],
        Meta(
            description="species -> atom (counted from 1) or element -> isotope: "
            '`species.W = { 2 = "D" }`; both sides and the saddle point of a step must hold the same'
        ),
    ] = {}


class PathKeys(Keys, frozen=True, kw_only=True):
    """A path of the profile; without any, paths are found from the steps."""

    name: Annotated[str, Meta(min_length=1, description="name of the path")]
    steps: Annotated[
        list[int],
        Meta(
            min_length=1,
            description="its steps, counted from 1, in their order; each is run in the direction "
            "that goes on, a negative number backward",
        ),
    ]


class ReferenceKeys(Keys, frozen=True, kw_only=True):
    """An enthalpy of formation that others are derived from."""

    enthalpy: Annotated[Quantity, Meta(description="enthalpy of formation / kJ/mol")]
    uncertainty: Annotated[
        Quantity | UnsetType, Meta(description="its standard uncertainty / kJ/mol")
    ] = UNSET
    temperature: Annotated[
        Quantity, Meta(description='where it holds: "0 K" or "298.15 K" / K')
    ] = "298.15 K"
    source: Annotated[str, Meta(description="where it is from; stands below the table")] = ""


class FormationKeys(Keys, frozen=True, kw_only=True):
    """Enthalpies of formation; the species named here need no step."""

    atoms: Annotated[
        list[str],
        Meta(
            description="species of this file that are atoms; their values come from the built-in "
            "table unless `reference` has them"
        ),
    ] = []
    atomization: Annotated[
        list[str] | UnsetType,
        Meta(
            description="species whose enthalpy of formation is derived from `atoms`; unless given, "
            "every neutral minimum that is read and made of them"
        ),
    ] = UNSET
    reactions: Annotated[
        list[str],
        Meta(
            description='balanced reactions, `"CH4 + H2O = CH3OH + H2"`, each with exactly one species '
            "without a reference value, which it gives"
        ),
    ] = []
    reference: Annotated[
        dict[str, ReferenceKeys],
        Meta(description="species -> known enthalpy of formation, `{ enthalpy, uncertainty }`"),
    ] = {}
    reaction_uncertainty: Annotated[
        Quantity | UnsetType,
        Meta(description="standard uncertainty of a computed reaction enthalpy / kJ/mol"),
    ] = UNSET
    spin_orbit: Annotated[
        bool,
        Meta(
            description="true: computed energies of `atoms` are means over their ground term, and the "
            "built-in levels bring them to the lowest level"
        ),
    ] = False


class RegimesKeys(Keys, frozen=True, kw_only=True, rename={"from_": "from"}):
    """The map of regimes over temperature and one held amount, for `barrier`."""

    over: Annotated[str, Meta(description="the held species whose amount varies")]
    from_: Annotated[
        Quantity,
        Meta(description="lower end; a number is in mol/L, of a species held at a pressure in Pa"),
    ]
    to: Annotated[Quantity, Meta(description="upper end")]
    points: Annotated[
        int, Meta(ge=2, description="points of the map along the amount, even in its logarithm")
    ] = 25


class SelectivityKeys(Keys, frozen=True, kw_only=True):
    """How products compete, for `barrier`."""

    products: Annotated[
        list[str],
        Meta(
            min_length=2,
            description="the products to compare, the first one over each other; unless given, all of "
            "`[effective] product`",
        ),
    ]
    kind: Annotated[
        SelectivityKind,
        Meta(
            description="what tells them apart; mirror images (`enantiomeric`) are looked at for being "
            "counted twice"
        ),
    ] = "products"


def _one_of(*names: str) -> dict[str, Any]:
    """Return the schema of "exactly one of these keys"."""
    return {"oneOf": [{"required": [name]} for name in names]}


_SpeciesTable = Annotated[
    SpeciesKeys,
    Meta(
        extra_json_schema={
            "oneOf": [
                {"required": ["frequencies"]},
                {"required": ["conformers"]},
                {"required": ["composition", "enthalpy", "entropy"]},
            ]
        }
    ),
]
_StepTable = Annotated[
    StepKeys,
    Meta(extra_json_schema=_one_of("through", "barrier", "rate", "arrhenius", "falloff")),
]
_EffectiveTable = Annotated[EffectiveKeys, Meta(extra_json_schema=_one_of("reactant", "catalyst"))]


class StudyKeys(Keys, frozen=True, kw_only=True):
    """The whole file."""

    title: Annotated[
        str | UnsetType, Meta(description="stands over every table; the file's name unless given")
    ] = UNSET
    outputs: Annotated[
        str,
        Meta(description="folder of the outputs, from the study's own; files are named from it"),
    ] = "."
    treatment: TreatmentKeys = TreatmentKeys()
    conditions: ConditionsKeys = ConditionsKeys()
    species: Annotated[
        dict[str, _SpeciesTable], Meta(description="a table `[species.NAME]` for every species")
    ]
    levels: Annotated[
        dict[str, LevelKeys],
        Meta(description="a table `[levels.NAME]` for every named level of theory: alternatives"),
    ] = {}
    level: Annotated[
        str | UnsetType,
        Meta(
            description="the named level that is used; species have no `energy` of their own then"
        ),
    ] = UNSET
    steps: Annotated[
        list[_StepTable],
        Meta(
            min_length=1,
            description="a table `[[steps]]` for every step; required unless there is a `[formation]`",
        ),
    ] = []
    effective: _EffectiveTable | UnsetType = UNSET
    doubt: DoubtKeys | UnsetType = UNSET
    isotopologues: Annotated[
        dict[str, IsotopologueKeys],
        Meta(
            description="a table `[isotopologues.NAME]` for every set of isotopes to compare with"
        ),
    ] = {}
    paths: Annotated[
        list[PathKeys], Meta(description="a table `[[paths]]` for every declared path")
    ] = []
    formation: Annotated[
        FormationKeys | UnsetType, Meta(description="enthalpies of formation, for `functions`")
    ] = UNSET
    regimes: Annotated[
        RegimesKeys | UnsetType,
        Meta(description="a map over temperature and one held amount, for `barrier`"),
    ] = UNSET
    selectivity: Annotated[
        SelectivityKeys | UnsetType, Meta(description="which products to compare, for `barrier`")
    ] = UNSET


def json_schema() -> dict[str, Any]:
    """Return the JSON Schema of the study file, for editors."""
    schema = msgspec.json.schema(StudyKeys)
    schema["$defs"]["StudyKeys"]["anyOf"] = [{"required": ["steps"]}, {"required": ["formation"]}]
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "thermo_pp study file",
        **schema,
    }
