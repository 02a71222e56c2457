"""Random networks as tables on a sheet: orders in halves, wide rate constants, masses conserved."""

import random
from dataclasses import dataclass

__all__ = ["Network", "draw", "numbers"]


@dataclass(frozen=True)
class Network:
    """Reactions as (left, right, orders, k), with a mass per species that every reaction conserves."""

    species: tuple[str, ...]
    masses: tuple[float, ...]
    reactions: tuple
    feed: tuple[float, ...]
    tau: float

    def law(self, j):
        _, _, orders, _ = self.reactions[j]
        return "*".join(["k", *(f"{name}^{order:g}" for name, order in orders)])

    def reaction_table(self):
        def side(terms):
            return " + ".join(f"{nu:.17g} {name}" for name, nu in terms)

        rows = [
            (f"{side(left)} -> {side(right)}", self.law(j), k)
            for j, (left, right, _, k) in enumerate(self.reactions)
        ]
        return (("Reaction", "Rate", "k"), *rows)

    def feed_table(self):
        return (("Species", "Feed"), *zip(self.species, self.feed, strict=True))

    def change(self):
        """Net coefficients, a row per reaction."""
        rows = []
        for left, right, _, _ in self.reactions:
            row = dict.fromkeys(self.species, 0.0)
            for name, nu in left:
                row[name] -= nu
            for name, nu in right:
                row[name] += nu
            rows.append([row[name] for name in self.species])
        return rows


def draw(seed, decades=6.0, orders=(0.5, 1.0, 1.5, 2.0), most=8, zero_feeds=0.4):
    """A network: each reaction turns one or two species into another, kilogram for kilogram.

    decades : half the width of the rate constants, log-uniform around 1
    """
    rng = random.Random(seed)
    n = rng.randint(2, most)
    species = tuple(f"s{i}" for i in range(n))
    masses = tuple(float(rng.randint(1, 3)) for _ in species)
    reactions = []
    for _ in range(rng.randint(1, most)):
        reactants = rng.sample(range(n), min(rng.randint(1, 2), n - 1))
        product = rng.choice([i for i in range(n) if i not in reactants])
        coefficients = [float(rng.randint(1, 2)) for _ in reactants]
        mass = sum(nu * masses[i] for i, nu in zip(reactants, coefficients, strict=True))
        left = tuple((species[i], nu) for i, nu in zip(reactants, coefficients, strict=True))
        law = tuple((species[i], rng.choice(orders)) for i in reactants)
        reactions.append(
            (left, ((species[product], mass / masses[product]),), law, 10 ** rng.uniform(-decades, decades))
        )
    feed = tuple(0.0 if rng.random() < zero_feeds else 10 ** rng.uniform(-3, 2) for _ in species)
    if not any(feed):
        feed = (1.0, *feed[1:])
    return Network(species, masses, tuple(reactions), feed, 10 ** rng.uniform(-3, 6))


def numbers(outcome):
    """A column or row of an outcome as floats; None where it has an error."""
    cells = [cell for row in outcome.block for cell in row]
    return cells if all(isinstance(cell, float) for cell in cells) else None
