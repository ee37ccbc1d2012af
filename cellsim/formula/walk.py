"""All nodes of a tree, without recursion."""

from __future__ import annotations

from collections.abc import Iterator

from cellsim.formula.tree import Binary, Call, Invocation, Node, Postfix, Unary


def walk(node: Node) -> Iterator[Node]:
    """Every node of a tree, a node before its parts, left to right; corners of ranges are no nodes."""
    stack = [node]
    while stack:
        current = stack.pop()
        yield current
        if isinstance(current, Binary):
            stack += (current.right, current.left)
        elif isinstance(current, (Unary, Postfix)):
            stack.append(current.operand)
        elif isinstance(current, Call):
            stack += reversed(current.arguments)
        elif isinstance(current, Invocation):
            stack += reversed(current.arguments)
            stack.append(current.function)
