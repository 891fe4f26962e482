"""The constants behind NWChem's printed thermochemistry, so that an audit compares like with like.

How they were found (NWChem 7.0.2, Debian): ``freq`` tasks with ``reuse`` of one Hessian multiplied by 1e6, at
temperatures up to 1e7 K, print nine digits of each term and so of each constant; the same numbers, to all digits,
are the double-precision literals of the program's routine (``vib_wrtfreq``). Its formulas are the usual ones,

    zero-point energy   1/2 R c2 sum(v)                         over modes above 0.1 cm^-1
    S translational     R (5/2 ln T + 3/2 ln M + s_t)           M in u, at 1 atm
    S rotational        R (ln(T/(sigma B)) + s_l)               linear, B in cm^-1
                        R (1/2 ln(T^3/(sigma^2 A B C)) + s_n)   nonlinear
    A, B, C             b / I                                   I in u bohr^2
    H - E               R T

and no electronic states. With R = 1.9863 cal/(mol K), too small by 4.6e-4, everything that it prints is too small:
the zero-point energy by 4.8e-4, since c2 is too small by 2.2e-5, too.
"""

from __future__ import annotations

import math

from thermo_pp import units

GAS_CAL_MOL_K = 1.9863
"""R: 3.165371255226564e-6 hartree/K in the program, times the next constant."""
HARTREE_KCAL_MOL = 627.5093314
SECOND_RADIATION_K_CM = 1.4387447832048996
"""c2 = h c / k."""
ROTATIONAL_CM_U_BOHR2 = 60.20017568546256
"""b."""
TRANSLATIONAL = -1.1647283894678548
"""s_t; -1.16487052 with CODATA 2022."""
LINEAR = 0.6363087146956653
"""s_l; 1 - ln c2 = 0.6362289."""
NONLINEAR = 1.526808639178372
"""s_n; 3/2 + 1/2 ln(pi) - 3/2 ln c2 = 1.5267084."""
PRESSURE_PA = units.ATM_PA
ANGSTROM_PER_BOHR = 1.0 / 1.889725989


def zero_point_kcal_mol(sum_cm: float) -> float:
    """Return the zero-point energy of modes whose wavenumbers sum to `sum_cm`, as NWChem has it, kcal/mol."""
    return 0.5e-3 * GAS_CAL_MOL_K * SECOND_RADIATION_K_CM * sum_cm


def _effective() -> dict[str, float]:
    """Return constants under the names of `units` with which the usual formulas give what NWChem prints.

    h/k follows from c2, h^2/(k u) from c2 and b, k from s_t; s_l and s_n then come out within 1e-4 (2e-4 cal/(mol K)).
    """
    c2_m = SECOND_RADIATION_K_CM / 100.0
    h_over_k = c2_m / units.LIGHT_M_S
    # theta = c2 b / I  =  h^2 / (8 pi^2 k u I)
    theta_m2 = SECOND_RADIATION_K_CM * ROTATIONAL_CM_U_BOHR2 * (ANGSTROM_PER_BOHR * 1e-10) ** 2
    h2_over_ku = 8.0 * math.pi**2 * theta_m2
    # s_t = ln[(2 pi / (h^2/(k u)))^(3/2) k / p] + 5/2
    log_volume = TRANSLATIONAL - 2.5 - 1.5 * math.log(2.0 * math.pi / h2_over_ku)
    boltzmann = PRESSURE_PA * math.exp(log_volume)
    planck = h_over_k * boltzmann
    return {
        "BOLTZMANN_J_K": boltzmann,
        "PLANCK_J_S": planck,
        "AVOGADRO_MOL": units.AVOGADRO_MOL,
        "LIGHT_M_S": units.LIGHT_M_S,
        "GAS_J_MOL_K": GAS_CAL_MOL_K * units.CALORIE_J,
        "ATOMIC_MASS_KG": planck**2 / (boltzmann * h2_over_ku),
        "HARTREE_J": HARTREE_KCAL_MOL * 1e3 * units.CALORIE_J / units.AVOGADRO_MOL,
        "BOHR_M": ANGSTROM_PER_BOHR * 1e-10,
        "CALORIE_J": units.CALORIE_J,
        "PRESSURE_PA": PRESSURE_PA,
    }


PRINTED_CONSTANTS: dict[str, float] = _effective()
"""Under the names of `units`; `PRESSURE_PA` besides, since NWChem does not print it (1 atm)."""
