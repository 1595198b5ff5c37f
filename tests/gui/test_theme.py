"""The themes: readable text, one source of colours."""

import pytest

from gui.colours import PALETTE, SpeciesColours
from gui.theme import DARK, LIGHT, Theme, contrast, readable, sized


@pytest.mark.parametrize("tokens", [LIGHT, DARK], ids=["light", "dark"])
@pytest.mark.parametrize("name", ["text", "muted", "accent", "warning", "error", "good"])
def test_text_stands_out(tokens, name):
    """WCAG 2.1, success criterion 1.4.3: 4.5 for text."""
    assert contrast(getattr(tokens, name), tokens.panel) >= 4.5
    assert contrast(getattr(tokens, name), tokens.page) >= 4.5


def test_contrast_of_black_and_white():
    """21 by the definition of WCAG 2.1."""
    assert contrast("#000000", "#ffffff") == pytest.approx(21.0)


@pytest.mark.parametrize("tokens", [LIGHT, DARK], ids=["light", "dark"])
def test_labels_of_species_are_readable(tokens):
    for colour in PALETTE:
        assert contrast(readable(colour, tokens), tokens.panel) >= 4.5
    assert contrast(SpeciesColours().label("CH4", tokens), tokens.panel) >= 4.5


def test_the_users_choice_wins(qapp):
    theme = Theme(qapp, "dark")
    assert theme.tokens is DARK
    theme.choose("light")
    assert theme.tokens is LIGHT
    assert LIGHT.accent in qapp.styleSheet()
    theme.close()


def test_three_sizes(qapp):
    sizes = [sized(qapp.font(), role).pointSizeF() for role in ("small", "body", "figure")]
    assert sizes == sorted(sizes)
    assert len(set(sizes)) == 3
