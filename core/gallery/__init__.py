"""The problem gallery: small deterministic generators for tests, benches and ``synth`` alike.

Small shapes with known answers live in :mod:`shapes`; the large random graphs in :mod:`recipes`,
where every edge is a pure function of its index and the seed, so that any part can be made at
any time, in any chunk size, in bounded memory (:func:`stream`).
"""

from kingpost.core.gallery.edges import EdgeList
from kingpost.core.gallery.recipes import (
    KINDS,
    Recipe,
    citation,
    layered_services,
    pairwise,
    powerlaw_undirected,
    recipe,
    rmat,
    stream,
)
from kingpost.core.gallery.shapes import (
    bipartite,
    clique_chain,
    complete,
    cycle,
    grid,
    hub,
    layered_dag,
    path,
    star,
    two_tied_components,
)

__all__ = [
    "KINDS",
    "EdgeList",
    "Recipe",
    "bipartite",
    "citation",
    "clique_chain",
    "complete",
    "cycle",
    "grid",
    "hub",
    "layered_dag",
    "layered_services",
    "pairwise",
    "path",
    "powerlaw_undirected",
    "recipe",
    "rmat",
    "star",
    "stream",
    "two_tied_components",
]
