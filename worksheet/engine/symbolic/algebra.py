"""The levels of one circuit: symbols by key, and the definition of each, built when it is first asked for.

Definitions of a transistor stand in laws.py, voltages in voltages.py, the network in network.py, metrics in metric.py;
here they are found by key and kept.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from functools import cached_property, lru_cache
from typing import TYPE_CHECKING, Any

from worksheet.engine.symbolic import laws, metric, settling, voltages
from worksheet.engine.symbolic.definition import AbsentError, Definition
from worksheet.engine.symbolic.neglects import DRIVE, SWITCHES
from worksheet.engine.symbolic.vocabulary import AT_NOMINAL, Word, canonical, word
from worksheet.model import metrics
from worksheet.stages.circuit import Circuit
from worksheet.stages.stage import Transistor

if TYPE_CHECKING:
    from worksheet.engine.symbolic.network import Network


@dataclass(frozen=True)
class Setting:
    """What an algebra is written for; two equal settings share their derivations.

    Attributes:
        circuit: The stage with its options.
        absent: Leaves that are left out because they do nothing: at 0, or at 1 where they multiply or are an exponent.
        neglects: Names of neglects that are made.
        nominal: Whether this is the nominal condition, where levels that are not assumed are found.
    """

    circuit: Circuit
    absent: frozenset[str] = frozenset()
    neglects: frozenset[str] = frozenset()
    nominal: bool = True

    def neglecting(self, names: frozenset[str]) -> Setting:
        """The same with these neglects made instead."""
        return replace(self, neglects=names)


class Algebra:
    """Every level of a setting."""

    def __init__(self, setting: Setting, stated: Callable[[Algebra], Mapping[str, Any]] | None = None) -> None:
        """Take the setting; nothing is derived yet.

        Args:
            setting: What the algebra is written for.
            stated: Gives expressions that replace the algebra's own by key; None for a level that is a leaf instead.
        """
        self.setting = setting
        self.circuit = setting.circuit
        if DRIVE in setting.neglects:
            self.circuit = replace(setting.circuit, driven_through_resistance=False)
        self._symbols: dict[str, Any] = {}
        self._keys: dict[Any, str] = {}
        self._definitions: dict[str, Definition | None] = {}
        self.stated: Mapping[str, Any] = stated(self) if stated is not None else {}
        for key, expression in self.stated.items():
            self._definitions[key] = None if expression is None else Definition(key, expression)

    @cached_property
    def network(self) -> Network:
        """The nodal equations in symbols."""
        from worksheet.engine.symbolic.network import Network

        return Network(self)

    def word(self, key: str) -> Word:
        """The name of a level. KeyError where there is none."""
        return word(self.circuit, key)

    def symbol(self, key: str) -> Any:
        """The sympy symbol of a level.

        Raises: KeyError where there is no such level.
        """
        import sympy

        key = canonical(self.circuit, key)
        if key not in self._symbols:
            named = self.word(key)
            assumption = {"positive": True} if named.positive else {"real": True}
            symbol = sympy.Symbol(named.symbol, **assumption)
            taken = self._keys.setdefault(symbol, key)
            if taken != key:
                raise ValueError(f"{taken} and {key} are both written {named.symbol}")
            self._symbols[key] = symbol
        return self._symbols[key]

    def key(self, symbol: Any) -> str | None:
        """The key of a symbol that this algebra made, None for another."""
        return self._keys.get(symbol)

    def has(self, key: str) -> bool:
        """Whether a leaf does anything in this setting."""
        if key in self.setting.absent:
            return False
        switch = SWITCHES.get(key.rpartition(".")[2])
        return switch is None or switch not in self.setting.neglects

    def leaf(self, key: str) -> Any:
        """A leaf's symbol, or the number at which it does nothing."""
        import sympy

        return self.symbol(key) if self.has(key) else sympy.Integer(neutral(key))

    def of(self, device: Transistor, value: str) -> Any:
        """The symbol of a device's level."""
        return self.symbol(f"{device.name}.{value}")

    def process(self, device: Transistor, parameter: str) -> Any:
        """A process parameter of a device as the process file states it, or the number at which it does nothing."""
        return self.leaf(f"{device.name}.process.{parameter}")

    def corner(self, device: Transistor, change: str) -> Any:
        """What the corner does to a device, or the number at which it does nothing."""
        return self.leaf(f"{device.name}.corner.{change}")

    def definition(self, key: str) -> Definition | None:
        """How a level is defined; None for a leaf, whose number is stated.

        Raises: KeyError where there is no such level.
        """
        key = canonical(self.circuit, key)
        if key not in self._definitions:
            try:
                self._definitions[key] = _plain(self._define(key))
            except AbsentError as absent:
                self._definitions[key] = Definition(key, None, missing=absent.reason)
        return self._definitions[key]

    def _define(self, key: str) -> Definition | None:
        if key.endswith(AT_NOMINAL):
            self.word(key)
            return None
        owner, _, value = key.partition(".")
        device = next((d for d in self.circuit.devices if d.name == owner), None)
        law: Callable[..., Definition | None] | None = None
        if device is not None and value in laws.LAWS:
            return laws.define(self, device, value)
        if device is not None and value in voltages.OF_DEVICE:
            return voltages.of_device(self, device, value)
        if metrics.find(key) is not None:
            return metric.define(self, key)
        for table in (laws.OF_CIRCUIT, voltages.OF_CIRCUIT, settling.OF_CIRCUIT, metric.OF_CIRCUIT):
            law = law or table.get(key)
        if law is not None:
            return law(self)
        if owner in ("node_capacitance", "network"):
            return Definition(key, self.network.level(key), source="Kirchhoff's current law at every node")
        self.word(key)
        return None

    def alias(self, key: str) -> str:
        """The level that a level is equal to where its definition is one bare symbol, else itself."""
        found = self.definition(key)
        if found is None or found.root is not None or found.expression is None:
            return key
        same = self.key(found.expression)
        return key if same is None else self.alias(same)

    def opened(self, expression: Any, stop: Callable[[str], bool]) -> Any:
        """An expression with every level opened that `stop` does not hold back, and what is then common cancelled.

        Args:
            expression: In this algebra's symbols.
            stop: Tells of a level's key whether it stays.
        """
        import sympy

        while True:
            keys = {s: self.key(s) for s in expression.free_symbols}
            found = {s: self.definition(k) for s, k in keys.items() if k is not None and not stop(k)}
            plain = {
                s: d.expression
                for s, d in found.items()
                if d is not None and d.root is None and d.expression is not None
            }
            if not plain:
                return sympy.factor(sympy.cancel(expression))
            expression = expression.xreplace(plain)

    def depends(self, key: str, on: str, held: frozenset[str] = frozenset()) -> bool:
        """Whether a level moves with another when `held` levels stay."""
        return on in self.reached(key, held)

    def reached(self, key: str, held: frozenset[str] = frozenset()) -> frozenset[str]:
        """Keys of all levels below one, itself among them, when `held` levels are not opened."""
        return self._reaches(canonical(self.circuit, key), held)

    def _reaches(self, key: str, held: frozenset[str]) -> frozenset[str]:
        memory = self._memory.setdefault(held, {})
        if key not in memory:
            memory[key] = frozenset()
            found = self.definition(key)
            reached = {key}
            if found is not None and found.expression is not None and key not in held:
                for inner in self.inputs(found):
                    reached |= self._reaches(inner, held)
            memory[key] = frozenset(reached)
        return memory[key]

    def touched(self, key: str, on: str, held: frozenset[str]) -> frozenset[str]:
        """Those of `held` through which a level moves with another."""
        reached, seen, waiting = set(), set(), [key]
        while waiting:
            each = waiting.pop()
            if each in seen or not self.depends(each, on):
                continue
            seen.add(each)
            if each in held:
                reached.add(each)
                continue
            found = self.definition(each)
            waiting += self.inputs(found) if found is not None and found.expression is not None else ()
        return frozenset(reached)

    def signature(self, key: str) -> frozenset[tuple[Any, ...]]:
        """What tells a level's whole derivation from another: every definition below it."""
        if key not in self._signatures:
            parts, waiting = set(), [key]
            while waiting:
                each = waiting.pop()
                found = self.definition(each)
                if found is None:
                    continue
                root = None if found.root is None else (found.root.left, found.root.right)
                part = (each, found.expression, root)
                if part not in parts:
                    parts.add(part)
                    waiting += self.inputs(found) if found.expression is not None else ()
            self._signatures[key] = frozenset(parts)
        return self._signatures[key]

    @cached_property
    def _signatures(self) -> dict[str, frozenset[tuple[Any, ...]]]:
        return {}

    @cached_property
    def _memory(self) -> dict[frozenset[str], dict[str, frozenset[str]]]:
        return {}

    def inputs(self, found: Definition) -> tuple[str, ...]:
        """Keys of the levels that a definition is written in, in the order in which they are printed."""
        parts = [found.expression, found.holds]
        if found.root is not None:
            parts += [found.root.left, found.root.right]
        symbols = {s for part in parts if part is not None for s in part.free_symbols if s in self._keys}
        return tuple(self._keys[s] for s in sorted(symbols, key=lambda s: s.name))


def neutral(key: str) -> int:
    """The number at which a leaf does nothing: 1 for factors and for exponents that are usually 1, else 0."""
    factor = ".corner." in key and key.endswith("_factor")
    return int(factor or key.endswith((".flicker_exponent", ".drain_coupling_exponent")))


def _plain(found: Definition | None) -> Definition | None:
    """A definition whose expression is a sympy object, also where it came out as a Python number."""
    import sympy

    if found is None or not isinstance(found.expression, int):
        return found
    return replace(found, expression=sympy.Integer(found.expression))


@lru_cache(maxsize=256)
def of(setting: Setting) -> Algebra:
    """The algebra of a setting, derived once."""
    return Algebra(setting)
