"""Small faults put into a module, one at a time: what a slip of the hand would leave behind."""

import ast
import copy
from collections.abc import Iterator
from dataclasses import dataclass

_COMPARISONS: dict[type[ast.cmpop], tuple[type[ast.cmpop], ...]] = {
    ast.Lt: (ast.LtE, ast.Gt),
    ast.LtE: (ast.Lt, ast.Gt),
    ast.Gt: (ast.GtE, ast.Lt),
    ast.GtE: (ast.Gt, ast.Lt),
    ast.Eq: (ast.NotEq,),
    ast.NotEq: (ast.Eq,),
    ast.Is: (ast.IsNot,),
    ast.IsNot: (ast.Is,),
    ast.In: (ast.NotIn,),
    ast.NotIn: (ast.In,),
}
_ARITHMETIC: dict[type[ast.operator], type[ast.operator]] = {
    ast.Add: ast.Sub,
    ast.Sub: ast.Add,
    ast.Mult: ast.Div,
    ast.Div: ast.Mult,
    ast.Pow: ast.Mult,
    ast.LShift: ast.RShift,
    ast.BitAnd: ast.BitOr,
    ast.BitOr: ast.BitAnd,
}


@dataclass(frozen=True)
class Mutant:
    """One fault."""

    file: str
    line: int
    was: str
    """The expression that was changed."""
    now: str
    source: str
    """The whole module with the fault."""

    def __str__(self) -> str:
        return f"{self.file}:{self.line}: {self.was}  ->  {self.now}"


def mutants_of(file: str, source: str) -> Iterator[Mutant]:
    """Every fault of a module: comparisons, arithmetic, signs, and/or, numbers."""
    tree = ast.parse(source)
    for node in ast.walk(tree):
        for changed in _changes(node):
            yield Mutant(
                file,
                getattr(node, "lineno", 0),
                ast.unparse(node),
                ast.unparse(changed),
                ast.unparse(_with(tree, node, changed)),
            )


def _changes(node: ast.AST) -> Iterator[ast.expr]:
    if isinstance(node, ast.Compare):
        for place, operator in enumerate(node.ops):
            for other in _COMPARISONS.get(type(operator), ()):
                fresh = copy.deepcopy(node)
                fresh.ops[place] = other()
                yield fresh
    elif isinstance(node, ast.BinOp) and type(node.op) in _ARITHMETIC:
        # ``int | None`` in an annotation is no arithmetic, and harmless.
        fresh_op = copy.deepcopy(node)
        fresh_op.op = _ARITHMETIC[type(node.op)]()
        yield fresh_op
    elif isinstance(node, ast.BoolOp):
        fresh_bool = copy.deepcopy(node)
        fresh_bool.op = ast.Or() if isinstance(node.op, ast.And) else ast.And()
        yield fresh_bool
    elif isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.USub | ast.Not | ast.Invert):
        yield copy.deepcopy(node.operand)
    elif isinstance(node, ast.Constant) and not isinstance(node.value, bool):
        # A number that is wrong by a twentieth, or by one where it counts.
        if isinstance(node.value, int):
            yield ast.Constant(node.value + 1)
        elif isinstance(node.value, float):
            yield ast.Constant(node.value * 1.05 or 0.05)


def _with(tree: ast.Module, old: ast.AST, new: ast.AST) -> ast.Module:
    """Return a copy of the tree in which one node is another."""
    # A deep copy that knows the one node already takes the other in its place.
    return copy.deepcopy(tree, {id(old): new})
