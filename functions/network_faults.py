"""Why the equations of a network have no single solution, in words."""

from __future__ import annotations

from collections.abc import Collection, Iterable

from tausheet.functions.network_elements import (
    CURRENT_TYPE,
    REFERENCE,
    VOLTAGE_TYPE,
    Element,
    Kind,
    Network,
    listed,
)


def fault(network: Network, undetermined: Collection[int]) -> str:
    """The sentence; `undetermined` are columns of unknowns that the equations leave open.

    Asked only once the equations are known to be singular: it finds the cause, and a network
    that merely looks odd is never refused for it.
    """
    connecting = [e for e in network.elements if not _open(e)]
    cut_off = _cut_off(network, connecting)
    if cut_off:
        return (
            f"network has a floating part: nothing connects {_nodes(network, cut_off)} with the "
            "reference node from t = 0 on; connect it, through a large resistor if need be"
        )
    for current_type, voltage_type in (
        ((Kind.CURRENT,), (Kind.VOLTAGE, Kind.SWITCH)),
        (CURRENT_TYPE, (*VOLTAGE_TYPE, Kind.SWITCH)),
    ):
        held = [e for e in connecting if e.kind not in current_type]
        cut_off = _cut_off(network, held)
        if cut_off:
            names = [
                e.name
                for e in connecting
                if e.kind in current_type and (e.tail in cut_off) != (e.head in cut_off)
            ]
            return (
                f"network has a cut of current sources: only {listed(names)} "
                f"{'leads' if len(names) == 1 else 'lead'} to {_nodes(network, cut_off)}; "
                "give the current another way, such as a resistor in parallel"
            )
        loop = _loop([e for e in connecting if e.kind in voltage_type])
        if loop:
            members = [e.name for e in connecting if e.name in loop]
            return (
                f"network has a loop of voltage sources: {listed(members)} (a closed switch counts "
                "as one, of 0 V); put a resistor between them or leave one out"
            )
    return (
        f"network has no single solution: its equations do not determine "
        f"{listed(_unknowns(network, undetermined))}; check the controlled sources, and that "
        "each op-amp is fed back"
    )


def _open(element: Element) -> bool:
    return element.kind is Kind.SWITCH and not element.value


def _nodes(network: Network, nodes: Collection[int]) -> str:
    names = [network.nodes[node] for node in sorted(nodes)]
    return f"node{'' if len(names) == 1 else 's'} {listed(names)}"


def _unknowns(network: Network, columns: Iterable[int]) -> list[str]:
    size = len(network.nodes)
    return [
        f"the potential of node {network.nodes[column]}"
        if column < size
        else network.elements[(column - size) % len(network.elements)].name
        for column in sorted(columns)
    ]


def _cut_off(network: Network, elements: Iterable[Element]) -> set[int]:
    """One group of nodes that these elements do not connect with the reference."""
    neighbours: dict[int, list[int]] = {node: [] for node in range(-1, len(network.nodes))}
    for element in elements:
        neighbours[element.tail].append(element.head)
        neighbours[element.head].append(element.tail)
    reached = _reach(neighbours, REFERENCE)
    lost = next((node for node in neighbours if node not in reached), None)
    return set() if lost is None else _reach(neighbours, lost)


def _reach(neighbours: dict[int, list[int]], start: int) -> set[int]:
    reached, todo = {start}, [start]
    while todo:
        for node in neighbours[todo.pop()]:
            if node not in reached:
                reached.add(node)
                todo.append(node)
    return reached


def _loop(elements: Iterable[Element]) -> list[str]:
    """Names of elements that form a loop; none when they form none."""
    trees: dict[int, list[tuple[int, str]]] = {}
    for element in elements:
        path = _path(trees, element.tail, element.head)
        if path is not None:
            return [*path, element.name]
        trees.setdefault(element.tail, []).append((element.head, element.name))
        trees.setdefault(element.head, []).append((element.tail, element.name))
    return []


def _path(trees: dict[int, list[tuple[int, str]]], start: int, end: int) -> list[str] | None:
    ways: dict[int, list[str]] = {start: []}
    todo = [start]
    while todo:
        node = todo.pop()
        if node == end:
            return ways[node]
        for other, name in trees.get(node, ()):
            if other not in ways:
                ways[other] = [*ways[node], name]
                todo.append(other)
    return None
