"""Circuit → flat SPICE deck under the user's hierarchical names, which ngspice and this room read as the same circuit.

An element inside an instance is called as ngspice calls it when flattening: its letter, a point, its path ("R.X1.R1").
Numbers are written in full and without suffix, every value in SI units.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from tauledger.circuit import Apply, Circuit, Current, Element, Formula, Model, Number, Variable, Voltage, fold

# The keyword before a formula; of B R C L it is the quantity itself.
_KEYWORD = {"E": "vol", "G": "cur"}
# The words that say what a vdmos model is stand alone; with parentheses round its values ngspice never ends.
_POLARITY = frozenset({"nchan", "pchan"})
_FLAGS = frozenset({"off", "on", "thermal"})


def flat_netlist(circuit: Circuit) -> str:
    """Write a circuit as a flat deck."""
    nodes = _distinct(circuit.nodes)
    elements = element_names(circuit)
    models = dict(zip((model.name for model in circuit.models), _distinct(m.name for m in circuit.models), strict=True))
    passives = circuit.passives
    lines = [f"* {circuit.title}".rstrip()]
    for k, name in enumerate(passives.name):
        value = float(passives.value[k])
        lines.append(f"{elements[fold(name)]} {nodes[passives.a[k]]} {nodes[passives.b[k]]} {value!r}")
    for element in circuit.elements:
        words = (elements[fold(element.name)], *(nodes[node] for node in element.nodes[: _own_nodes(element)]))
        lines.append(" ".join((*words, *_rest(element, nodes, elements, models))))
    lines += [_model(models[model.name], model) for model in circuit.models]
    if circuit.nodesets:
        lines.append(" ".join((".nodeset", *(f"v({nodes[node]})={value!r}" for node, value in circuit.nodesets))))
    settings = [("temp", circuit.temperature_c), ("tnom", circuit.tnom_c), *circuit.options]
    lines.append(" ".join((".options", *(f"{name}={float(value)!r}" for name, value in settings))))
    lines.append(".end")
    return "\n".join(lines) + "\n"


def _own_nodes(element: Element) -> int:
    """The control pairs of POLY stand behind its number."""
    return 2 if element.polynomial else len(element.nodes)


def _rest(
    element: Element, nodes: tuple[str, ...], elements: Mapping[str, str], models: Mapping[str, str]
) -> Iterator[str]:
    """Give what stands behind the nodes."""
    parameters = dict(element.parameters)
    references = [elements[fold(name)] for name in element.references]
    if element.letter in "VI":
        yield f"dc {parameters.pop('dc', 0.0)!r}"
        if "acmag" in parameters:
            yield f"ac {parameters.pop('acmag')!r} {parameters.pop('acphase', 0.0)!r}"
    elif element.polynomial:
        controls = [nodes[node] for node in element.nodes[2:]] or references
        yield f"POLY({len(controls) // (2 if element.nodes[2:] else 1)})"
        yield from controls
        yield from (repr(value) for value in element.polynomial)
    else:
        yield from references
        if element.model:
            yield models[element.model]
        for own in ("value", "gain", "coupling"):
            if own in parameters:
                yield repr(parameters.pop(own))
    if isinstance(element.formula, Apply) and element.formula.function == "table":
        variable, *numbers = (formula_text(part, nodes, elements) for part in element.formula.arguments)
        pairs = zip(numbers[::2], numbers[1::2], strict=True)
        yield " ".join((f"TABLE {{{variable}}} =", *(f"({x.strip('()')},{y.strip('()')})" for x, y in pairs)))
    elif element.formula is not None:
        text = formula_text(element.formula, nodes, elements)
        keyword = element.quantity if element.letter in "BRCL" else _KEYWORD[element.letter]
        yield f"{keyword}={text}" if element.letter == "B" else f"{keyword}='{text}'"
    for name, value in parameters.items():
        yield name if name in _FLAGS else f"{name}={value!r}"


def formula_text(formula: Formula, nodes: tuple[str, ...], elements: Mapping[str, str]) -> str:
    """Write a formula in the behavioural dialect; an operator inside another one stands in parentheses.

    nodes: names by number. elements: written names by folded flat name.
    """

    def inside(part: Formula) -> str:
        text = written(part)
        simple = not isinstance(part, Apply) or part.function.isidentifier()
        return text if simple else f"({text})"

    def written(part: Formula) -> str:
        match part:
            case Number(value=value):
                return repr(value) if value >= 0.0 else f"({value!r})"
            case Voltage(plus=plus, minus=minus):
                return f"v({nodes[plus]},{nodes[minus]})" if minus else f"v({nodes[plus]})"
            case Current(source=source):
                return f"i({elements[fold(source)]})"
            case Variable(name=name):
                return name
            case Apply(function="?:", arguments=(condition, yes, no)):
                return f"{inside(condition)} ? {inside(yes)} : {inside(no)}"
            case Apply(function=function, arguments=arguments) if function.isidentifier():
                return f"{function}({','.join(written(argument) for argument in arguments)})"
            case Apply(function=sign, arguments=(only,)):
                return f"{sign}{inside(only)}"
            case Apply(function=sign, arguments=(left, right)):
                return f"{inside(left)}{sign}{inside(right)}"
        raise TypeError(part)

    return written(formula)


def _model(name: str, model: Model) -> str:
    words = [".model", name, model.type]
    words += [parameter for parameter, _ in model.parameters if parameter in _POLARITY]
    words += [f"level={model.level}"] if model.level != 1 else []
    words += [f"{parameter}={value!r}" for parameter, value in model.parameters if parameter not in _POLARITY]
    return " ".join(words)


def element_names(circuit: Circuit) -> dict[str, str]:
    """Give the name on the card by folded flat name: it must begin with the element's letter."""
    flat = [*zip(circuit.passives.kind, circuit.passives.name, strict=True)]
    flat += [(element.letter, element.name) for element in circuit.elements]
    cards = [name if fold(name[:1]) == fold(letter) else f"{letter}.{name}" for letter, name in flat]
    return {fold(name): card for (_, name), card in zip(flat, _distinct(cards), strict=True)}


def _distinct(names: Iterator[str] | tuple[str, ...] | list[str]) -> tuple[str, ...]:
    """Write names in ASCII; where two come out alike (ngspice would merge them) the later one gets underscores."""
    taken: set[str] = set()
    written = []
    for name in names:
        plain = name if name.isascii() else "".join(c if c.isascii() else f"_u{ord(c):04x}" for c in name)
        # a part that a Change added has blanks in its name
        plain = plain.replace(", ", "_").replace(" ", "_")
        while fold(plain) in taken:
            plain += "_"
        taken.add(fold(plain))
        written.append(plain)
    return tuple(written)
