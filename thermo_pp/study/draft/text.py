"""Text of a draft: the study file, with what was found and what was guessed in comments."""

from __future__ import annotations

import textwrap
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from thermo_pp import __version__
from thermo_pp.names import DEFAULT_LOW_MODES, DEFAULT_ONSET_CM, DEFAULT_STANDARD_STATE, Phase
from thermo_pp.study.draft.energies import SinglePoints
from thermo_pp.study.draft.members import Member, Members, described
from thermo_pp.study.draft.naming import harmless, toml_text
from thermo_pp.study.draft.question import PLACEHOLDER, Question
from thermo_pp.study.draft.steps import NoStep, ProposedStep

WIDTH = 100
TEMPERATURES = '{ from = "250 K", to = "400 K", step = "10 K" }'
VISCOSITY = "0.89 mPa s"
"""Of water at 25 degC: what the docs of the study file have as their example."""
MOST_LISTED = 12
MOST_LEVELS = 6


@dataclass(frozen=True, eq=False)
class Parts:
    """Everything that the text of a draft says.

    Attributes
    ----------
    title, outputs : str
        `outputs` is the folder as the study names it.
    files : mapping of str to str
        Path of an output -> its name from the folder of the outputs.
    found : Members
    used : tuple of str
        Species of the steps, saddle points last.
    lowest : tuple of str
        Of every molecule the conformer that stands for it.
    levels : tuple of SinglePoints
    level : SinglePoints or None
        The one whose energies are used.
    phase : {"gas", "solution"}
    steps : tuple of ProposedStep
    without : tuple of NoStep
    asked : Question or None
    above : mapping of str to tuple of (str, float)
        Species -> its conformers that are left out, and how much higher their G is, kJ/mol.
    equals : mapping of str to str
        Of minima in no step, which sets of others have the same atoms.
    """

    title: str
    outputs: str
    files: Mapping[str, str]
    found: Members
    used: tuple[str, ...]
    lowest: tuple[str, ...]
    levels: tuple[SinglePoints, ...]
    level: SinglePoints | None
    phase: Phase
    steps: tuple[ProposedStep, ...]
    without: tuple[NoStep, ...]
    asked: Question | None
    above: Mapping[str, tuple[tuple[str, float], ...]]
    equals: Mapping[str, str]


def study_text(parts: Parts) -> str:
    """Write the study file."""
    blocks = [
        [
            *comment(
                f"A first study file, written by thermo-pp {__version__} draft. It loads as it is; look "
                "at every GUESS before you use a number."
            ),
            f"title = {toml_text(parts.title)}",
            f"outputs = {toml_text(parts.outputs)}",
        ],
        _treatment(parts),
        _conditions(parts),
        _levels(parts),
        *(_species(name, parts) for name in parts.used),
        _unused(parts),
        *(_step(step, parts) for step in parts.steps),
        *(_without(each) for each in parts.without),
        _effective(parts),
        _left_out(parts),
    ]
    return "\n\n".join("\n".join(lines) for lines in blocks if lines)


def comment(text: str, indent: str = "") -> list[str]:
    """Return a text as comment lines."""
    return textwrap.wrap(
        harmless(text),
        WIDTH,
        initial_indent="# " + indent,
        subsequent_indent="# " + indent + ("  " if indent else ""),
        break_long_words=False,
        break_on_hyphens=False,
    )


def _treatment(parts: Parts) -> list[str]:
    state = DEFAULT_STANDARD_STATE if parts.phase == "gas" else "1 mol/L"
    lines = ["[treatment]", f'standard_state = "{state}"', f'phase = "{parts.phase}"']
    if parts.phase == "solution":
        lines[1:1] = comment("GUESS: a solution, because the frequencies have a solvent model.")
    return [
        *lines,
        f'low_modes = "{DEFAULT_LOW_MODES}"',
        f'onset = "{DEFAULT_ONSET_CM:g} cm^-1"',
    ]


def _conditions(parts: Parts) -> list[str]:
    lines = [
        "[conditions]",
        *comment("GUESS: the temperatures; write those that you are after."),
        f"temperatures = {TEMPERATURES}",
    ]
    asked = parts.asked
    if asked is None or not (asked.stated or asked.equilibrium):
        return lines
    held = {name: toml_text(PLACEHOLDER[parts.phase]) for name in asked.stated}
    held |= dict.fromkeys(asked.equilibrium, '"equilibrium"')
    words = (
        "GUESS: what is there in excess and stays constant, as free concentrations. The amounts "
        "stated are placeholders: put your own."
    )
    if asked.by_products:
        words += f" {', '.join(asked.by_products)}: made by the reaction, held to keep it linear."
    inside = ", ".join(f"{name} = {value}" for name, value in held.items())
    return [*lines, *comment(words), f"held = {{ {inside} }}"]


def _levels(parts: Parts) -> list[str]:
    words, count = parts.found.levels[0]
    lines = comment(f"Frequencies: {words} ({_structures(count)}).")
    if len(parts.found.levels) > 1:
        frequencies = parts.found.levels[1:]
        rest = "; ".join(f"{each} ({_structures(n)})" for each, n in frequencies[:MOST_LEVELS])
        rest += f"; {len(frequencies) - MOST_LEVELS} more" if len(frequencies) > MOST_LEVELS else ""
        lines += comment(
            f"GUESS: of several levels that with most structures which steps join. Left out: {rest}."
        )
    if parts.level is None:
        lines += comment("Energies: those of the frequency jobs.")
    else:
        others = [level for level in parts.levels if level is not parts.level]
        guess = "GUESS: " if others else ""
        lines += comment(
            f"{guess}Energies: single points, {parts.level.words}, which all species have. The "
            "method was ranked first, then the basis, double-zeta ones of correlated methods last."
            if others
            else f"Energies: single points, {parts.level.words}, which all species have."
        )
    for level in parts.levels:
        if level is parts.level:
            continue
        lacking = [name for name in parts.used if name not in level.of]
        if lacking:
            have = len(parts.used) - len(lacking)
            said = f"only {have} of {len(parts.used)} species have it, not {_listed(lacking)}"
        else:
            said = "all species have it"
        lines += comment(f"Also there: {level.words}; {said}.")
    return lines


def _structures(count: int) -> str:
    return "1 structure" if count == 1 else f"{count} structures"


def _listed(names: Sequence[str]) -> str:
    more = f" and {len(names) - MOST_LISTED} more" if len(names) > MOST_LISTED else ""
    return ", ".join(names[:MOST_LISTED]) + more


def _member(name: str, parts: Parts) -> Member:
    return parts.found.minima.get(name) or parts.found.saddles[name]


def _species(name: str, parts: Parts) -> list[str]:
    member = _member(name, parts)
    lines = comment(described(member) + ".")
    lines += _conformer_words(name, parts)
    lines.append(f"[species.{name}]")
    lines.append(f"frequencies = {toml_text(parts.files[member.calculation.path])}")
    for level in parts.levels:
        if name in level.of:
            file = toml_text(parts.files[level.of[name].path])
            other = level is not parts.level
            lines.append(
                f"# energy = {harmless(file)}  # {harmless(level.words)}"
                if other
                else f"energy = {file}"
            )
    lines += [
        f"{key} = {value}  # GUESS: the output does not say it"
        for key, value in member.declared.items()
    ]
    return lines


def _conformer_words(name: str, parts: Parts) -> list[str]:
    """List the other conformers of a species, with how much higher they are."""
    above = parts.above.get(name, ())
    if not above:
        return []
    listed = "; ".join(
        f"{parts.files[parts.found.minima[each].calculation.path]} ({higher:+.1f} kJ/mol)"
        for each, higher in above[:MOST_LISTED]
    )
    more = f"; {len(above) - MOST_LISTED} more" if len(above) > MOST_LISTED else ""
    return comment(
        f"GUESS: of its conformers the one of least G(298.15 K) is taken. The others: {listed}{more}."
    )


def _unused(parts: Parts) -> list[str]:
    """Write the minima of no step as comments: a species that no step uses is an error."""
    names = [name for name in parts.lowest if name not in parts.used]
    if not names:
        return []
    lines = comment("No step was found for these; take the # away together with a step of theirs.")
    for name in names:
        member = parts.found.minima[name]
        file = harmless(toml_text(parts.files[member.calculation.path]))
        lines += [f"# [species.{name}]  # {described(member)}", f"# frequencies = {file}"]
        if parts.equals.get(name):
            lines += comment(f"It has the atoms of: {parts.equals[name]}.", "  ")
    return lines


def _step(step: ProposedStep, parts: Parts) -> list[str]:
    lines = [line for words in step.words for line in comment(words)]
    lines += ["[[steps]]", f"equation = {toml_text(step.equation)}"]
    if step.through is not None:
        return [*lines, f"through = {toml_text(step.through)}"]
    lines.append('barrier = "none"')
    if parts.phase == "solution":
        lines.append(f'viscosity = "{VISCOSITY}"  # GUESS: water at 25 degC')
    return lines


def _without(without: NoStep) -> list[str]:
    lines = comment(f"No step goes through the saddle point {without.saddle}.")
    return lines + [line for words in without.words for line in comment(words)]


def _effective(parts: Parts) -> list[str]:
    asked = parts.asked
    if asked is None:
        words = (
            "No reactant and product were found that make the network linear: name them here, and "
            "what is in excess as `held` in [conditions]."
        )
        return [*comment(words), "# [effective]", '# reactant = "..."', '# product = "..."']
    products = [toml_text(name) for name in asked.products]
    product = products[0] if len(products) == 1 else f"[{', '.join(products)}]"
    return [
        *comment(
            "GUESS: from the highest to the lowest free species along the steps. For a turnover "
            'frequency write catalyst = "..." in place of the reactant.'
        ),
        "[effective]",
        f"reactant = {toml_text(asked.reactant)}",
        f"product = {product}",
    ]


def _left_out(parts: Parts) -> list[str]:
    if not parts.found.left_out:
        return []
    lines = comment("Not used:")
    for path, why in parts.found.left_out[: 10 * MOST_LISTED]:
        lines += comment(f"{parts.files.get(path, path)}: {why}", "  ")
    rest = len(parts.found.left_out) - 10 * MOST_LISTED
    return [*lines, *(comment(f"and {rest} more", "  ") if rest > 0 else [])]
