"""Reads BURCAT_THR.xml: one `Block` per species and phase, text kept as it stands."""

import re
import xml.etree.ElementTree as ET
from dataclasses import dataclass, field

from species_db.build.places import package_dir

_RANGES = (("range_Tmin_to_1000", "low"), ("range_1000_to_Tmax", "high"))


@dataclass
class Block:
    index: int
    sub: int
    cas: str
    name: str  # short name of the phase block
    text: str  # long name
    reference: str
    h298_text: str
    notes: str
    source: str
    date: str
    phase: str
    quality: str
    mass: float
    counts: list[tuple[str, str]]
    T_min: float
    T_max: float
    low: list[float] | None = None
    high: list[float] | None = None
    h298_R: float | None = None  # stated h298/R, K
    repairs: list[str] = field(default_factory=list)
    unreadable: bool = False


def read_blocks() -> list[Block]:
    """All blocks of the file, in its order."""
    root = ET.parse(package_dir("thermochem") / "BURCAT_THR.xml").getroot()
    blocks = []
    for index, species in enumerate(root):
        for sub, phase in enumerate(species.findall("phase")):
            blocks.append(_block(species, phase, index, sub))
    return blocks


def _text(node: ET.Element, tag: str) -> str:
    found = node.find(tag)
    if found is None:
        return ""
    parts = [(c.text or "").strip() for c in found] if len(found) else [(found.text or "").strip()]
    return " | ".join(parts)


def _block(species: ET.Element, phase: ET.Element, index: int, sub: int) -> Block:
    limits, elements, coefficients = (
        phase.find(tag) for tag in ("temp_limit", "elements", "coefficients")
    )
    assert limits is not None
    assert elements is not None
    assert coefficients is not None
    block = Block(
        index,
        sub,
        species.get("CAS") or "",
        (phase.findtext("formula") or "").strip(),
        _text(species, "formula_name_structure"),
        _text(species, "reference"),
        _text(species, "hf298"),
        _text(species, "additional_information"),
        (phase.findtext("source") or "").strip(),
        (phase.findtext("date") or "").strip(),
        (phase.findtext("phase") or "").strip(),
        (phase.findtext("calc_quality") or "").strip(),
        float(phase.findtext("molecular_weight") or "nan"),
        [(e.get("name") or "", e.get("num_of_atoms") or "") for e in elements],
        float(limits.get("low") or "nan"),
        float(limits.get("high") or "nan"),
    )
    for tag, name in _RANGES:
        node = coefficients.find(tag)
        assert node is not None
        values = [_number(e.text, block) for e in node]
        if any(v is None for v in values):
            block.unreadable = True
        elif any(values):
            setattr(block, name, [float(v) for v in values if v is not None])
    block.h298_R = _number(coefficients.findtext("hf298_div_r"), block)
    return block


def _number(text: str | None, block: Block) -> float | None:
    """A coefficient; a blank where the sign of the exponent belongs is read as plus."""
    text = (text or "").strip()
    try:
        return float(text)
    except ValueError:
        pass
    blank = re.fullmatch(r"[-+]?[\d.]+E?\s+\d+", text)
    fixed = re.sub(r"\s+", "+", text) if blank else text.replace(" ", "")
    try:
        value = float(re.sub(r"[dD](?=[-+\d])", "E", fixed))
    except ValueError:
        return None
    if "blank exponent read as plus" not in block.repairs:
        block.repairs.append("blank exponent read as plus")
    return value
