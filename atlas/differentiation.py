"""Exact derivatives of formulas, through sympy; symbols are built from the checked tree alone."""

from __future__ import annotations

from typing import Any

from atlas.tree import Node


def to_sympy(node: Node) -> Any:
    raise NotImplementedError


def from_sympy(expression: Any) -> Node:
    raise NotImplementedError


def derivative(node: Node, name: str) -> Node:
    raise NotImplementedError
