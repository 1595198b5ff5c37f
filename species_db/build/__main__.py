"""``python -m species_db.build``: writes ``species_db/data/species.tsv`` and ``left_out.csv``."""

from collections import Counter

from species_db.build import (
    apart,
    atct,
    boil,
    choose,
    crc,
    keys,
    melts,
    names,
    trc,
    uncertainty,
    write,
)
from species_db.build.burcat import burcat_drafts
from species_db.build.chain import chain_blocks
from species_db.build.draft import Draft, LeftOut
from species_db.build.hand import hand_drafts
from species_db.build.janaf import janaf_drafts
from species_db.build.places import DATA
from species_db.build.properties import critical_constants, molar_volume
from species_db.build.volumes import estimate_volumes

ZERO = 10.0
"""An element whose record has less than this as formation enthalpy, J/mol, is in its reference
state, and is set to zero exactly."""


def collect() -> tuple[list[Draft], list[LeftOut], list[str]]:
    """All chosen records, what was left out, and shifts that were refused."""
    janaf, out = janaf_drafts()
    burcat, lost = burcat_drafts()
    out += lost
    burcat_gas = [d for d in burcat if d.phase == "gas"]
    burcat_condensed = chain_blocks([d for d in burcat if d.phase != "gas"], out)
    janaf_gas = [d for d in janaf if d.phase == "gas"]
    janaf_condensed = [d for d in janaf if d.phase != "gas"]
    hand = hand_drafts()
    have: set[tuple[object, str]] = {
        (d.identity, d.phase)
        for d in janaf_condensed + burcat_condensed + [d for d in hand if not d.form]
    }
    crc_solids = crc.perry_solids(have)
    have |= {(d.identity, d.phase) for d in crc_solids}
    constant = crc.constant_cp_drafts(have, out)
    liquids = melts.liquid_drafts(crc_solids + constant + hand, have)
    made = {d.identity for d in liquids}
    constant = [d for d in constant if not (d.phase == "liquid" and d.identity in made)]
    organic, lost = trc.trc_drafts({d.cas for d in burcat_gas + janaf_gas if d.cas})
    out += lost
    everything = (
        burcat_gas + janaf_gas + organic + janaf_condensed + burcat_condensed + hand
        + crc_solids + liquids + constant
    )  # fmt: skip
    for d in everything:
        d.h_as_read = d.h298
    taken = {d.identity for d in hand if d.phase == "gas"}
    burcat_has = {d.identity for d in burcat_gas + janaf_gas} & taken
    if burcat_has:
        raise SystemExit(f"hand_entries.toml: a gas that another source has: {burcat_has}")
    gases = choose.gases([d for d in everything if d.phase == "gas"], out)
    condensed = choose.condensed([d for d in everything if d.phase != "gas"], out)
    chosen = gases + condensed
    for d in chosen:
        if len(d.elements) == 1 and not d.charge and abs(d.h298) < ZERO:
            d.is_reference = True
    refused = atct.move(chosen, everything)
    for d in chosen:
        if d.is_reference:
            d.shift(dh=-d.h298)
    chosen = apart.drop_undercutting(chosen, out)
    apart.keep_apart(chosen)
    chosen = boil.gate(chosen, out)
    uncertainty.assign(chosen, everything)
    return chosen, out, refused


def main() -> None:
    drafts, out, refused = collect()
    names.give_names(drafts)
    keys.give_keys(drafts)
    for d in drafts:
        if d.phase == "gas" and not d.charge and d.cas:
            d.critical = critical_constants(d)
        elif d.phase != "gas" and d.cas:
            d.molar_volume = molar_volume(d)
    print("volumes estimated:", estimate_volumes(drafts))
    write.species_table(drafts, keys.named_records(drafts), DATA / "species.tsv")
    reasons = write.left_out_table(out, DATA / "left_out.csv")
    write.counts_table(drafts, reasons, DATA / "counts.csv")
    print(f"{len(drafts)} records", dict(Counter(_class(d) for d in drafts)))
    print("left out:", sum(reasons.values()))
    for reason, n in reasons.most_common():
        print(f"  {n:5d}  {reason}")
    print("shifts refused:", len(refused))
    for line in refused:
        print("  ", line)


def _class(d: Draft) -> str:
    return "ion" if d.charge else d.phase


if __name__ == "__main__":
    main()
