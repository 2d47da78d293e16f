"""Random networks, repeatable by seed: RC, RLC, with amplifiers; up to 12 nodes; values over their whole range."""

from __future__ import annotations

import math
import random

from reactance.analysis.circuit.network import (
    Amplifier,
    Bead,
    Capacitor,
    CurrentSource,
    Element,
    Inductor,
    Network,
    Resistor,
    VoltageSource,
)


def random_network(seed: int) -> tuple[Network, str, str]:
    """A connected network, the name of its source, and the node to watch."""
    rng = random.Random(seed)
    kind = ("rc", "rlc", "amplifier")[seed % 3]
    nodes = [f"n{k}" for k in range(rng.randint(2, 8 if kind == "amplifier" else 11))]
    elements: list[Element] = []

    def draw(low: float, high: float) -> float:
        return float(f"{math.exp(rng.uniform(math.log(low), math.log(high))):.4g}")

    def name(letter: str) -> str:
        return f"{letter}{len(elements)}"

    def capacitor(a: str, b: str) -> Capacitor:
        real = rng.random() < 0.5
        return Capacitor(
            name("C"), a, b, draw(1e-15, 1e-3) if rng.random() < 0.2 else draw(1e-12, 1e-5),
            esr=draw(1e-3, 10.0) if real else 0.0,
            esl=draw(1e-10, 1e-8) if real and kind != "rc" else 0.0,
            leakage=draw(1e6, 1e9) if rng.random() < 0.2 else math.inf,
        )  # fmt: skip

    def passive(a: str, b: str) -> Element:
        pick = rng.random()
        if kind == "rc":
            return Resistor(name("R"), a, b, draw(1e-2, 1e6)) if pick < 0.5 else capacitor(a, b)
        if pick < 0.4:
            return Resistor(name("R"), a, b, draw(1e-2, 1e6))
        if pick < 0.7:
            return capacitor(a, b)
        if pick < 0.9:
            return Inductor(name("L"), a, b, draw(1e-9, 1e-2), draw(1e-3, 10.0), draw(1e-14, 1e-11))
        return Bead(name("F"), a, b, draw(1e-2, 1.0), draw(10.0, 2e3), draw(1e-8, 1e-5), draw(1e-13, 1e-11))

    feed = rng.random() < 0.5
    if feed:
        elements.append(
            VoltageSource("source", nodes[0], "0", 1.0, rng.choice([0.0, draw(1e-3, 1e3)]), rng.choice([0.0, 2e-8]))
        )
    else:
        elements.append(CurrentSource("source", nodes[0], "0", 1.0))
    elements.append(Resistor(name("R"), nodes[0], "0", draw(1.0, 1e6)))
    for k, node in enumerate(nodes[1:], start=1):
        other = rng.choice(nodes[:k])
        elements.append(Resistor(name("R"), node, other, draw(1.0, 1e6)))
        elements.append(capacitor(node, rng.choice(["0", "0", *nodes[:k]])))
        if rng.random() < 0.6:
            elements.append(passive(node, rng.choice([n for n in ["0", *nodes] if n != node])))
    if kind == "amplifier":
        inner = rng.choice(nodes)
        bandwidth = math.inf if rng.random() < 0.3 else draw(1e5, 1e8)
        elements.append(
            Amplifier("U1", inner, "buffer", "buffer", draw(1e3, 1e6), bandwidth, rng.choice([0.0, draw(1.0, 200.0)]))
        )
        elements.append(Resistor("RL", "buffer", "after", draw(10.0, 1e5)))
        elements.append(Capacitor("CL", "after", "0", draw(1e-12, 1e-6)))
        nodes.append("after")
    return Network(tuple(elements)), "source", nodes[-1]
