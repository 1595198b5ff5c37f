"""Names of the trade that mean one form of a substance, whatever shares its CAS number."""

TRADE_NAMES = {
    "ice": "H2O(s)",
    "silica": "SiO2(quartz)",
    "sand": "SiO2(quartz)",
    "rust": "Fe2O3(s)",
    "haematite": "Fe2O3(s)",
    "cementite": "Fe3C(s)",
    "slaked lime": "Ca(OH)2(s)",
    "hydrated lime": "Ca(OH)2(s)",
    "chalk": "CaCO3(calcite)",
}
