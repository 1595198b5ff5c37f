"""What is held fixed: the pair, its two values, the heat that crosses the wall, restrictions."""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QComboBox, QGridLayout, QWidget

from gui import edits, gas_edits, pairs, readings
from gui.fields.quantity_field import QuantityField
from gui.parts.card import Card, Label, Sentence, link
from gui.parts.restrictions_section import RestrictionsSection
from gui.session import Session
from gui.theme import GRID, sized
from solver.gas_model import GAS_MODELS
from solver.project.model import Quantity
from solver.project.units import UnitError, canonical, from_si, to_si
from solver.project.wording import quantity_text


class ValueRow:
    """Label, field, echo and sentence of one variable; empty means as fed."""

    def __init__(self, grid: QGridLayout, row: int, variable: pairs.Variable, empty: str) -> None:
        self.variable = variable
        self.label = Label(variable.words, "muted")
        self.field = QuantityField(variable.kind, variable.batch_unit, optional=True)
        self.field.setPlaceholderText(empty)
        self.field.setAccessibleName(variable.words)
        self.field.set_hint(f"For example {variable.hint}. Leave it empty for “{empty}”.")
        self.as_fed = link(empty, f"Empty the field: {variable.words} {empty}")
        self.echo = Label("", "muted", "small")
        self.echo.setAlignment(Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter)
        self.sentence = Sentence()
        self.label.setBuddy(self.field)
        self.field.setMinimumWidth(120)
        grid.addWidget(self.label, row, 0)
        grid.addWidget(self.field, row, 1)
        grid.addWidget(self.as_fed, row, 2)
        grid.addWidget(self.echo, row, 3)
        grid.addWidget(self.sentence, row + 1, 1, 1, 3)

    def set_visible(self, visible: bool) -> None:
        """Show or hide the whole row."""
        for widget in (self.label, self.field, self.as_fed, self.echo):
            widget.setVisible(visible)
        if not visible:
            self.sentence.say("")

    def show_fault(self, text: str) -> None:
        """Mark the field and say why."""
        self.field.set_fault(text)
        self.sentence.say(text)


class GasRow:
    """The gas model: a menu, and the way to its k_ij and to what it is worth."""

    def __init__(self, session: Session, grid: QGridLayout, row: int) -> None:
        self._session = session
        self.label = Label("gas", "muted")
        self.menu = QComboBox()
        self.menu.setAccessibleName("gas model")
        self.menu.setToolTip(
            "An ideal gas, or an equation of state for high pressure, with a liquid of its own"
        )
        for key, words in GAS_MODELS.items():
            self.menu.addItem(words, key)
        self.menu.activated.connect(self._pick)
        self.details = link(
            "k_ij, compare", "The gas model's parameters, and the ideal answer beside (Ctrl+6)"
        )
        self.details.setFont(sized(self.details.font(), "small"))
        self.sentence = Sentence()
        self.label.setBuddy(self.menu)
        grid.addWidget(self.label, row, 0)
        grid.addWidget(self.menu, row, 1, 1, 2)
        grid.addWidget(self.details, row, 3, Qt.AlignmentFlag.AlignRight)
        grid.addWidget(self.sentence, row + 1, 1, 1, 3)

    def refresh(self) -> None:
        """Show the model of the session's case."""
        key = self._session.case.gas
        self.menu.setCurrentIndex(self.menu.findData(key))
        self.details.setVisible(key != "ideal" or bool(self._session.case.interactions))

    def show_faults(self) -> None:
        """What is wrong with the model or one of its pairs."""
        found = self._session.faults_at("gas") + self._session.faults_at("interactions")
        self.sentence.say("\n".join(dict.fromkeys(fault.text for fault in found)))

    def _pick(self, at: int) -> None:
        key = self.menu.itemData(at)
        case = gas_edits.set_gas(self._session.case, key)
        self._session.edit_case(case, f"gas: {GAS_MODELS[key]}")


class HeldFixed(Card):
    """The pair menu, a row for each value it needs, and the gas model."""

    def __init__(
        self,
        session: Session,
        choices: Callable[[], list[pairs.PairChoice]] = pairs.choices,
    ) -> None:
        super().__init__("Held fixed")
        self._session = session
        self.choices = choices()
        self.menu = QComboBox()
        self.menu.setAccessibleName("pair of state variables that is held")
        for pair in self.choices:
            self.menu.addItem(f"{pair.words}  ({pair.name})", pair.name)
        self.menu.activated.connect(self._pick)
        self.body.addWidget(self.menu)
        grid = QGridLayout()
        grid.setContentsMargins(0, GRID // 2, 0, 0)
        grid.setHorizontalSpacing(GRID)
        grid.setVerticalSpacing(GRID // 2)
        grid.setColumnStretch(3, 1)
        self.rows: dict[str, ValueRow] = {}
        for i, variable in enumerate(pairs.VARIABLES.values()):
            row = ValueRow(grid, 2 * i, variable, "as fed")
            self.rows[variable.symbol] = row
            row.field.typed.connect(lambda q, v=variable: self._type(v, q))
            row.as_fed.clicked.connect(lambda _=False, v=variable: self._type(v, None))
        heat = pairs.Variable("heat", "heat added", "heat", "kJ", "kW", "50 kW; negative when lost")
        self.heat = ValueRow(grid, 20, heat, "none")
        self.heat.field.typed.connect(self._type_heat)
        self.heat.as_fed.clicked.connect(lambda: self._type_heat(None))
        self.gas = GasRow(session, grid, 30)
        self.body.addLayout(grid)
        self.sentence = Sentence()
        self.body.addWidget(self.sentence)
        self.restrictions = RestrictionsSection(session)
        self.body.addWidget(self.restrictions)
        self.head.insertWidget(self.head.count() - 1, self.restrictions.add)
        for row in (*self.rows.values(), self.heat):
            row.field.left.connect(session.end_visit)
        # Tab goes down the fields in the order they stand in.
        order: list[QWidget] = [self.menu]
        for row in (*self.rows.values(), self.heat):
            order += [row.field, row.as_fed]
        order += [self.gas.menu, self.gas.details]
        for a, b in pairwise(order):
            QWidget.setTabOrder(a, b)
        session.document_changed.connect(self.refresh)
        session.answer_changed.connect(self.show_answer)
        self.refresh()

    def variables(self) -> tuple[str, ...]:
        """The variables of the pair that is held."""
        pair = self._session.case.fixed.pair
        return next((c.variables for c in self.choices if c.name == pair), tuple(pair.split(",")))

    def refresh(self) -> None:
        """Show pair and values of the session's case."""
        fixed = self._session.case.fixed
        at = self.menu.findData(fixed.pair)
        if at < 0:
            self.menu.addItem(f"{fixed.pair}, not available yet", fixed.pair)
            at = self.menu.count() - 1
        self.menu.setCurrentIndex(at)
        wanted = self.variables()
        flow = self._flow()
        for symbol, row in self.rows.items():
            row.field.default_unit = row.variable.flow_unit if flow else row.variable.batch_unit
            row.field.show_quantity(fixed.values.get(symbol))  # type: ignore[call-overload]
            row.set_visible(symbol in wanted)
            row.as_fed.setVisible(
                symbol in wanted and symbol in fixed.values and symbol not in "Tp"
            )
        self.heat.field.default_unit = "kW" if flow else "kJ"
        self.heat.field.show_quantity(fixed.heat)
        energy = any(v in wanted for v in pairs.ENERGY)
        self.heat.set_visible(energy)
        self.heat.as_fed.setVisible(energy and fixed.heat is not None)
        self.gas.refresh()
        self.show_answer()

    def show_answer(self) -> None:
        """Faults at their fields, and each value in another unit or as fed."""
        session, wanted = self._session, self.variables()
        answer = session.answer
        settled = answer.value if answer.state == "settled" else None
        for symbol, row in self.rows.items():
            if symbol not in wanted:
                continue
            found = session.faults_at(f"fixed.{symbol}") + session.faults_at(
                f"fixed.values.{symbol}"
            )
            row.show_fault(found[0].text if found else "")
            row.echo.setText("" if found else self._echo(symbol, settled))
        found = session.faults_at("fixed.heat")
        self.heat.show_fault(found[0].text if found else "")
        own = [
            f for f in session.answer.faults if f.field in ("fixed", "fixed.pair", "restrictions")
        ]
        self.sentence.say("\n".join(f.text for f in own))
        self.gas.show_faults()
        self.heat.echo.setText(
            "" if session.case.fixed.heat is not None or settled is None else "adiabatic"
        )

    def _echo(self, symbol: str, answer) -> str:  # type: ignore[no-untyped-def]
        typed = self._session.case.fixed.values.get(symbol)  # type: ignore[call-overload]
        kind = pairs.VARIABLES[symbol].kind
        if typed is None:
            if answer is None:
                return ""
            value = getattr(answer.fed, symbol)
            return "" if value is None else _fed_text(symbol, value, answer.basis == "flow")
        if symbol == "T":
            return _other(typed, kind, ("K", "degC"))
        if symbol == "p":
            return _other(typed, kind, ("bar", "barg"))
        return ""

    def _flow(self) -> bool:
        units = [a.unit for s in self._session.case.streams for a in s.amounts]
        units += [s.total.unit for s in self._session.case.streams if s.total]
        return any("/" in unit for unit in units)

    def _pick(self, at: int) -> None:
        case = edits.set_fixed(self._session.case, pair=self.menu.itemData(at))
        self._session.edit_case(case, f"hold {self.menu.itemData(at)}")

    def _type(self, variable: pairs.Variable, quantity: Quantity | None) -> None:
        case = edits.set_value(self._session.case, variable.symbol, quantity)
        label = f"type {variable.words}" if quantity else f"{variable.words} as fed"
        self._session.edit_case(case, label, f"fixed.{variable.symbol}")

    def _type_heat(self, quantity: Quantity | None) -> None:
        case = edits.set_fixed(self._session.case, heat=quantity)
        self._session.edit_case(case, "type heat", "fixed.heat")


def _other(quantity: Quantity, kind: str, units: tuple[str, str]) -> str:
    """The quantity in the first of two units it was not typed in."""
    try:
        si = to_si(quantity, kind)
        typed = canonical(quantity.unit, kind)
    except UnitError:
        return ""
    unit = units[1] if typed == units[0] else units[0]
    return quantity_text(from_si(si, unit, kind), unit)


def _fed_text(symbol: str, value: float, flow: bool) -> str:
    if symbol == "T":
        return quantity_text(from_si(value, "degC", "temperature"), "degC")
    if symbol == "p":
        return quantity_text(from_si(value, "bar", "pressure"), "bar")
    if symbol == "V":
        return quantity_text(*readings.volume(value, flow))
    scale = readings.entropy if symbol == "S" else readings.energy
    return quantity_text(*scale(value, flow))
