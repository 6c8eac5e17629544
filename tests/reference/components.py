"""Slow twin of kernels/components.py, by networkx."""

import networkx as nx


def label_components(rows, columns, pairs):
    """The components as sets of ('row', i) and ('column', j)."""
    graph = nx.Graph()
    graph.add_nodes_from(("row", i) for i in range(rows))
    graph.add_nodes_from(("column", j) for j in range(columns))
    graph.add_edges_from((("row", i), ("column", j)) for i, j in pairs)
    return {frozenset(part) for part in nx.connected_components(graph)}


def members(label, count):
    """Indices of each label, as lists."""
    return [[k for k, value in enumerate(label) if value == c] for c in range(count)]
