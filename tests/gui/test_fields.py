"""Fields: text with a unit in, the same text out; what is wrong stays as typed."""

import pytest
from PySide6.QtCore import Qt

from gui.fields.quantity_field import QuantityField
from gui.fields.reading import read_quantity, show_quantity
from gui.fields.species_completer import SpeciesCompleter
from solver.project.model import Quantity

from .fakes import H2, N2


@pytest.mark.parametrize(
    ("text", "value", "unit"),
    [
        ("25 degC", 25.0, "degC"),
        ("25 °C", 25.0, "degC"),
        ("77 F", 77.0, "degF"),
        ("300", 300.0, "K"),
        ("-300 degC", -300.0, "degC"),  # below absolute zero: kept apart for the refusal
        ("25 parsec", 25.0, "parsec"),
        ("warm", "warm", ""),
        ("", "", ""),
    ],
)
def test_reading_temperatures(text, value, unit):
    assert read_quantity(text, "temperature", "K") == Quantity(value=value, unit=unit)


def test_showing_keeps_the_unit_that_was_typed():
    assert show_quantity(Quantity(value=24.0, unit="barg")) == "24 barg"
    assert show_quantity(Quantity(value=850.0, unit="degC")) == "850 °C"
    assert show_quantity(Quantity(value="warm", unit="")) == "warm"
    assert show_quantity(None) == ""


@pytest.fixture
def field(qtbot):
    field = QuantityField("pressure", "bar")
    qtbot.addWidget(field)
    field.show()
    return field


def test_each_keystroke_is_passed_on(field, qtbot):
    got = []
    field.typed.connect(got.append)
    qtbot.keyClicks(field, "24 barg")
    assert got[-1] == Quantity(value=24.0, unit="barg")
    assert len(got) == 7
    field.show_quantity(got[-1])
    assert field.text() == "24 barg"  # as typed, not as formatted


def test_a_bare_number_takes_the_last_unit_and_shows_it_when_left(field, qtbot):
    field.show_quantity(Quantity(value=350.0, unit="psig"))
    got = []
    field.typed.connect(got.append)
    field.selectAll()
    qtbot.keyClicks(field, "400")
    assert got[-1] == Quantity(value=400.0, unit="psig")
    assert field.text() == "400"
    qtbot.keyClick(field, Qt.Key.Key_Return)
    assert field.text() == "400 psig"


def test_nonsense_stays_in_the_field(field, qtbot):
    got = []
    field.typed.connect(got.append)
    qtbot.keyClicks(field, "much")
    field.show_quantity(got[-1])
    assert field.text() == "much"
    field.set_fault("'much' is not a number with a unit.")
    assert field.property("faulty") == "true"
    assert "not a number" in field.toolTip()
    field.set_fault("")
    assert field.property("faulty") == "false"


def test_a_change_from_outside_replaces_the_text(field, qtbot):
    qtbot.keyClicks(field, "5 bar")
    field.show_quantity(Quantity(value=1.0, unit="atm"))
    assert field.text() == "1 atm"


def test_an_optional_field_emptied_means_none(qtbot):
    field = QuantityField("heat", "kJ", optional=True)
    qtbot.addWidget(field)
    field.show_quantity(Quantity(value=5.0, unit="kJ"))
    got = []
    field.typed.connect(got.append)
    field.selectAll()
    qtbot.keyClick(field, Qt.Key.Key_Backspace)
    assert got == [None]


def test_completion_offers_species_and_puts_the_key(qtbot):
    from PySide6.QtWidgets import QLineEdit

    line = QLineEdit()
    qtbot.addWidget(line)
    line.show()
    line.activateWindow()
    line.setFocus()
    qtbot.waitUntil(line.hasFocus)
    asked = []

    def search(text, limit):
        asked.append(text)
        return [H2, N2]

    completer = SpeciesCompleter(search, line)
    completer.attach(line)
    qtbot.keyClicks(line, "hy")
    assert asked == ["h", "hy"]
    assert completer.offered() == ["H2", "N2"]
    popup = completer.popup()
    assert popup.isVisible()
    qtbot.keyClick(popup, Qt.Key.Key_Down)
    qtbot.keyClick(popup, Qt.Key.Key_Return)
    assert line.text() == "H2"
