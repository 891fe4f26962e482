"""Methods in words: what was done in this study and nothing else, with what it goes back to."""

from __future__ import annotations

from collections.abc import Iterator

from thermo_pp import __version__
from thermo_pp.ensemble import Ensemble
from thermo_pp.names import LowModes
from thermo_pp.output.document.geometries import Shape, shapes
from thermo_pp.output.document.model import Paragraph
from thermo_pp.output.notes import of_treatment
from thermo_pp.study.answers import Answers

_SOFT: dict[LowModes, tuple[str, tuple[str, ...]]] = {
    "harmonic": ("Every mode was taken as a harmonic oscillator.", ()),
    "raised": (
        "Wavenumbers below {onset} cm⁻¹ were raised to it in zero-point energy, enthalpy and entropy.",
        ("Ribeiro2011",),
    ),
    "rotor-entropy": (
        "The entropy of soft modes goes over into that of a free rotor below about {onset} cm⁻¹; "
        "their enthalpy is that of oscillators. Apparent activation quantities are exact derivatives "
        "of the free energies that follow.",
        ("Grimme2012",),
    ),
    "rotor-enthalpy": (
        "Entropy and enthalpy of soft modes go over into those of a free rotor below about {onset} "
        "cm⁻¹.",
        ("Grimme2012", "Li2015"),
    ),
}


def methods(answers: Answers) -> tuple[Paragraph, ...]:
    """Return the methods of a study, a paragraph each."""
    found = shapes(answers.study.species)
    return (
        *_outputs(answers),
        *_energies(answers, found),
        *_structures(answers, found),
        *_steps(answers),
        *_rates(answers),
        Paragraph(
            f"All of this was computed with thermo_pp {__version__} and constants of CODATA 2022."
        ),
    )


def _outputs(answers: Answers) -> Iterator[Paragraph]:
    programs: dict[str, None] = {}
    for one in answers.inputs:
        if one.program is not None:
            programs[" ".join(part for part in (one.program, one.program_version) if part)] = None
    if programs:
        yield Paragraph(
            f"Geometries, energies and frequencies are from outputs of {', '.join(programs)}."
        )
    for sentence in answers.study.levels:
        yield Paragraph(sentence)
    if answers.study.level is not None:
        yield Paragraph(f"Energies are those of the named level {answers.study.level}.")


def _energies(answers: Answers, found: tuple[Shape, ...]) -> Iterator[Paragraph]:
    parts = [part for shape in found for part in shape.model.energy.parts]
    if any(len(shape.model.energy.parts) > 1 for shape in found):
        yield Paragraph(
            "Electronic energies are sums of parts; a table below has every part with its factor."
        )
    if any(part.slot == "extrapolate.correlation" for part in parts):
        yield Paragraph(
            "Correlation energies were extrapolated to the limit of the basis set by two points, with "
            "an inverse power of the cardinal number, the third unless a table says otherwise.",
            ("Helgaker1997",),
        )
    limits = [p.name for p in parts if p.slot == "extrapolate.reference" and p.origin == "derived"]
    for mark, words, key in (
        ("exp(-1.63 X)", "exp(-1.63 X)", "Halkier1999"),
        ("(X+1) exp(-9 sqrt X)", "(X+1) exp(-9√X)", "Karton2006"),
    ):
        if any(mark in name for name in limits):
            yield Paragraph(
                f"Hartree-Fock energies were extrapolated with {words}, X the cardinal number.",
                (key,),
            )
    if any(part.slot == "counterpoise" for part in parts):
        yield Paragraph(
            "Energies of complexes have the counterpoise correction at the geometry of the complex.",
            ("Boys1970",),
        )
    if any(part.slot == "solvation" for part in parts):
        yield Paragraph(
            "Solvation free energies, 1 mol/L to 1 mol/L, stand in the electronic energies."
        )


def _structures(answers: Answers, found: tuple[Shape, ...]) -> Iterator[Paragraph]:
    treatment = answers.study.treatment
    if found:
        yield Paragraph(
            "H, S and G of each structure are those of an ideal gas of rigid rotors with vibrations "
            f"and electronic levels, enthalpies with the electronic energy. {of_treatment(treatment)}",
            ("McQuarrie1976",),
        )
        words, cites = _SOFT[treatment.low_modes]
        yield Paragraph(words.format(onset=f"{treatment.onset_cm:g}"), cites)
    models = [shape.model for shape in found]
    if any(model.symmetry_number != 1 or model.degeneracy != 1 for model in models):
        yield Paragraph(
            "Symmetry numbers are orders of the rotation groups of the geometries; a chiral structure "
            "counts twice unless only one hand is present.",
            ("FernandezRamos2007",),
        )
    if any(model.torsions for model in models):
        yield Paragraph(
            "Torsions that a table names are hindered rotors: the levels of one angle in a Fourier "
            "potential stand in the place of one mode.",
            ("Pitzer1942",),
        )
    if any(model.seam is not None for model in models):
        yield Paragraph(
            "At crossing points of spin states the vibrations are those along the seam: translations, "
            "rotations and the difference of the gradients of both states were projected out of the "
            "Hessian that belongs to it.",
            ("HarveyAschi1999",),
        )
    if any(isinstance(model, Ensemble) for model in answers.study.species.values()):
        yield Paragraph(
            "Species with several conformers (or spin states) are mixtures of them in equilibrium, the "
            "entropy of mixing included.",
            ("Pracht2021",),
        )
    if len(found) < len(answers.study.species) and any(
        not one.result.rows for one in answers.species.values()
    ):
        yield Paragraph("Enthalpies and entropies of declared species are those of the study file.")


def _steps(answers: Answers) -> Iterator[Paragraph]:
    steps = answers.study.mechanism.steps
    if any(step.through is not None for step in steps):
        yield Paragraph(
            "Rate constants of steps through a saddle point are those of transition-state theory, the "
            "reverse ones from detailed balance.",
            ("Eyring1935", "Evans1935"),
        )
    if any(step.rate is not None for step in steps):
        yield Paragraph("Some rate constants are declared in the study file.")
    for step in steps:
        if not step.barrierless and step.through is None:
            continue
        if answers.study.treatment.phase == "gas":
            yield Paragraph(
                "Steps without a barrier run at the rate of hard-sphere collisions, which also limits the "
                "others; radii are those of the sphere with the van der Waals volume of the atoms.",
                ("Alvarez2013",),
            )
        else:
            yield Paragraph(
                "Steps without a barrier run at the limit of diffusion, 8RT/3η, which also limits the "
                "others."
            )
        break
    if any(step.falloff is not None for step in steps):
        yield Paragraph(
            "Rate constants with fall-off are those of the declared limits and broadening."
        )
    if any(step.crossing is not None for step in steps):
        yield Paragraph(
            "Crossings between spin states have a declared probability, or Landau's and Zener's averaged "
            "over thermal energies."
        )
    used = {step.tunnelling for step in steps if step.through is not None}
    if "wigner" in used:
        yield Paragraph("Tunnelling: Wigner's factor, 1 + u²/24.", ("Wigner1932",))
    if "eckart" in used:
        yield Paragraph(
            "Tunnelling: through the asymmetric Eckart barrier of the step's own two sides.",
            ("Eckart1930", "Johnston1962"),
        )


def _rates(answers: Answers) -> Iterator[Paragraph]:
    effective = answers.effective
    rates = [] if effective is None else [rate for rate in effective.rates.values() if rate]
    if rates:
        yield Paragraph(
            "The effective rate is exact for the mechanism: it was found by elimination without a "
            "subtraction, and its Arrhenius energy by differentiating that.",
            ("Grassmann1985",),
        )
    if rates:
        yield Paragraph(
            "Control of a state is d ln k/d(-G/RT), all others kept.", ("Campbell2017",)
        )
    if any(one.name == "energetic span" for rate in rates for one in rate.approximations):
        yield Paragraph(
            "The energetic span stands beside the exact rate as an approximation.", ("Kozuch2011",)
        )
    if answers.transient is not None:
        yield Paragraph(
            "Time courses were integrated by an implicit Runge-Kutta method of order 5 (Radau IIA).",
            ("Hairer1996",),
        )
    if answers.flow is not None:
        yield Paragraph("A stirred tank that flows was solved for its steady state.")
    if answers.isotopes:
        yield Paragraph(
            "Isotope effects are ratios of two computations with the wavenumbers of one Hessian; "
            "beside them stand those of reduced partition functions.",
            ("Bigeleisen1947",),
        )
