"""Formula text as the trade writes it; the base of every key."""

from collections.abc import Mapping

from species_db.formula import Composition, parse_formula

WRITTEN = """
CH3OH C2H5OH HCOOH CH3COOH CH3NH2 CH3SH CH3CN HCN HNCO HCO HCHO=CH2O HOCO=HCO2
COS COCl2 COF2 ClCN BrCN ICN FCN NCO N2O NOCl NOBr NOF NO2Cl NO2F SOCl2 SO2Cl2 SOF2 SO2F2
HOCl HOBr HOI HOF HClO4 HNO HNO2 HNO3 HNO4 NH2OH NH2Cl NH4Cl NH4Br NH4I NH4F NH4NO3 NH4ClO4
NH4HCO3 NH4HS (NH4)2SO4 NH4HSO4 (NH4)2CO3 NH2COONH4 CO(NH2)2 NH4CN NH4NO2 NH4VO3
(NH4)2HPO4 NH4H2PO4 NH4N3 N2H5NO3
H2CO3 H2SO3 H2SO4 H3PO4 H3PO3 HPO3 H3BO3 HBO2 HBO H2SiO3 H4SiO4 H2O H2O2 HO2 OH HNF2 H3O
NaHCO3 KHCO3 NaHSO4 KHSO4 Na2S2O3 Na2HPO4 NaH2PO4 KHF2 NaHF2 NaCN KCN NaSCN KSCN NaOCl
NaClO3 NaClO4 KClO3 KClO4 LiClO4 Mg(ClO4)2 KBrO3 KIO3 NaIO3 NaClO2 NaOH KOH LiOH
Ca(HCO3)2 CaHPO4 CaSO4.2H2O Na2CO3.10H2O Na2SO4.10H2O MgCl2.6H2O MgSO4.7H2O CuSO4.5H2O
FeOOH AlOOH MnOOH Ni(CO)4 Fe(CO)5 Cr(CO)6 Mo(CO)6 W(CO)6 Fe(CN)2 CaCN2 Hg2Cl2 Hg2Br2 Hg2I2 Hg2F2
Na2C2O4 CaC2O4 (COOH)2 Pb3O4 Fe3O4 Co3O4 Mn3O4 Fe0.947O UO2F2 PH3 AsH3 SbH3 SiH4 GeH4
CF2Cl2 CFCl3 CHF2Cl CHFCl2 CF3Cl CF3Br CH3Cl CHCl3 CH2Cl2 CCl4 CBrCl3 SF5Cl PSCl3 POCl3
C2N2 C4N2 HCCO CNO NCN CS2 CSe2 HNC HSO3Cl H2NO HON ClOO=ClO2 FO2 N2H4 N2H2 N2H3 NH NH2 NH3 HN3
NH4OH (NH4)2SiF6 BaCl2.2H2O CaSO4.0.5H2O CaMg(CO3)2 HReO4 H2WO4 H2MoO4 KH2PO4 HCOONa HCOOK
CH3COONa CH3COOK NaNH2 KNH2 LiNH2
CuFeS2
Al2SiO5 CaSiO3 MgSiO3 Mg2SiO4 Ca2SiO4 Ca3SiO5 Fe2SiO4 Na2SiO3 K2SiO3 NaAlSiO4 KAlSi3O8 NaAlSi3O8
"""
"""Formulas whose trade spelling does not follow from the rules below."""

_ORDER = """
Fr Cs Rb K Na Li Ra Ba Sr Ca Mg Be Ac Th Pa U Np Pu La Ce Pr Nd Pm Sm Eu Gd Tb Dy Ho Er Tm Yb Lu
Y Sc Os Ru Fe Ir Rh Co Pt Pd Ni Au Ag Cu Hg Cd Zn Tl In Ga Al Pb Sn Bi Po
Hf Zr Ti Ta Nb V W Mo Cr Re Tc Mn Ge At Rn Xe Kr Ar Ne He B Si C Sb As P N H Te Se S I Br Cl O F
""".split()
_RANK = {symbol: i for i, symbol in enumerate(_ORDER)}
_NONMETALS = set("Xe Kr Ar Ne He Rn B Si C Sb As P N H Te Se S I Br Cl O F Ge".split())
_HALOGENS = ("F", "Cl", "Br", "I")
_GROUPS = {("S", 4): "SO4", ("N", 3): "NO3", ("P", 4): "PO4"}


def _written() -> dict[Composition, str]:
    table: dict[Composition, str] = {}
    for word in WRITTEN.split():
        text = word.partition("=")[2] or word
        parsed = parse_formula(text)
        if parsed is None:
            raise ValueError(f"trade.py: {text!r} is no formula")
        table.setdefault(parsed[0], text)
    return table


_TABLE = _written()


def _part(symbol: str, count: float) -> str:
    return symbol if count == 1 else f"{symbol}{count:g}"


def hill(elements: Mapping[str, float]) -> str:
    """Formula in the order of Hill's system: C, H, then the alphabet."""
    first = [s for s in ("C", "H") if s in elements] if "C" in elements else []
    return "".join(
        _part(s, elements[s]) for s in first + sorted(e for e in elements if e not in first)
    )


def trade_formula(elements: Mapping[str, float], charge: int = 0) -> str:
    """Formula as the trade writes it, with its charge.

    Listed spellings first; compounds of C and H in Hill's order; hydroxides as M(OH)n; several
    sulfate, nitrate or phosphate groups in brackets; oxyacids with H in front; oxyhalides with O
    before the halogen; else electropositive before electronegative (IUPAC, Red Book 2005,
    table VI, with hydrogen between N and Te).
    """
    if not elements:
        return "e-"
    text = _TABLE.get(tuple(sorted((s, float(n)) for s, n in elements.items())))
    if text is None:
        text = _by_rule(elements)
    sign = "+" if charge > 0 else "-"
    size = str(abs(charge)) if abs(charge) > 1 else ""
    return text + (size + sign if charge else "")


def _by_rule(elements: Mapping[str, float]) -> str:
    metals = sorted((e for e in elements if e not in _NONMETALS), key=_RANK.__getitem__)
    lead = "".join(_part(m, elements[m]) for m in metals)
    rest = {e: n for e, n in elements.items() if e not in metals}
    if "C" in rest and "H" in rest:
        return lead + hill(rest)
    if metals and set(rest) == {"O", "H"} and rest["O"] == rest["H"]:
        return lead + ("OH" if rest["O"] == 1 else f"(OH){rest['O']:g}")
    if metals and len(rest) == 2 and "O" in rest:
        (centre,) = set(rest) - {"O"}
        n = rest[centre]
        group = _GROUPS.get((centre, int(rest["O"] / n)))
        if group and n > 1 and rest["O"] == int(rest["O"] / n) * n:
            return f"{lead}({group}){n:g}"
    order = sorted(rest, key=_RANK.__getitem__)
    halogens = [h for h in _HALOGENS if h in rest]
    centres = [e for e in order if e not in ("O", "H", *_HALOGENS)]
    halate = metals and not centres and rest.get("O", 0) >= 3
    halate = halate and len(halogens) == 1 and rest[halogens[0]] == 1
    if "O" in rest and halogens and (centres or metals) and not halate:
        order = [e for e in order if e not in ("O", *_HALOGENS)] + ["O"]
        order += sorted(halogens, key=_RANK.__getitem__, reverse=False)
    acid = set(centres) <= {"N", "P", "S", "B", "Se", "Te", "As"}
    if "H" in rest and "O" in rest and not metals and acid:
        order = ["H"] + [e for e in order if e != "H"]
    if "H" in rest and not centres and not metals:
        order = ["H"] + [e for e in order if e != "H"]
    return lead + "".join(_part(e, rest[e]) for e in order)
