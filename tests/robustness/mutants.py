"""Small faults put into the program's own text, one at a time: other operators, other numbers,
turned conditions."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from dataclasses import dataclass

_OPERATORS: dict[type[ast.AST], str] = {
    ast.Add: "-", ast.Sub: "+", ast.Mult: "/", ast.Div: "*", ast.Pow: "*", ast.FloorDiv: "/",
    ast.Mod: "*", ast.MatMult: "*", ast.BitAnd: "|", ast.BitOr: "&",
    ast.Lt: "<=", ast.LtE: "<", ast.Gt: ">=", ast.GtE: ">", ast.Eq: "!=", ast.NotEq: "==",
    ast.Is: "is not", ast.IsNot: "is", ast.In: "not in", ast.NotIn: "in",
}  # fmt: skip


@dataclass(frozen=True)
class Mutant:
    """`text` takes the place of the source between two places, (line, column) counted in bytes."""

    line: int
    start: tuple[int, int]
    end: tuple[int, int]
    before: str
    text: str

    def put_into(self, source: str) -> str:
        lines = source.encode("utf-8").splitlines(keepends=True)
        (first, left), (last, right) = self.start, self.end
        middle = lines[first - 1][:left] + self.text.encode("utf-8") + lines[last - 1][right:]
        return b"".join([*lines[: first - 1], middle, *lines[last:]]).decode("utf-8")


def mutants(source: str) -> Iterator[Mutant]:
    """All mutants of a module, in the order of its text. Annotations, texts and what only speaks to
    a person (`raise` and its sentence) are left alone."""
    tree = ast.parse(source)
    found = [m for node in _living(tree) for m in _of(node, source)]
    return iter(sorted(found, key=lambda m: (m.start, m.text)))


def _living(node: ast.AST) -> Iterator[ast.AST]:
    """The nodes below one that do something when the program runs."""
    yield node
    for name, value in ast.iter_fields(node):
        if name in ("annotation", "returns", "decorator_list", "type_params"):
            continue
        for child in value if isinstance(value, list) else [value]:
            if isinstance(child, ast.AST) and not isinstance(child, (ast.Raise, ast.JoinedStr)):
                yield from _living(child)


def _of(node: ast.AST, source: str) -> Iterator[Mutant]:
    if isinstance(node, ast.BinOp):
        yield from _between(node.left, node.right, _OPERATORS.get(type(node.op)), source)
    elif isinstance(node, ast.Compare):
        places = [node.left, *node.comparators]
        for left, right, operator in zip(places, places[1:], node.ops, strict=False):
            yield from _between(left, right, _OPERATORS.get(type(operator)), source)
    elif isinstance(node, ast.BoolOp):
        other = "or" if isinstance(node.op, ast.And) else "and"
        for left, right in zip(node.values, node.values[1:], strict=False):
            yield from _between(left, right, other, source)
    elif isinstance(node, ast.Constant) and isinstance(node.value, bool):
        yield _instead(node, str(not node.value), source)
    elif isinstance(node, ast.Constant) and isinstance(node.value, int | float):
        yield _instead(node, repr(node.value + 1), source)
    elif isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.USub):
        yield _instead(node, _text(node.operand, source), source)
    elif isinstance(node, ast.If | ast.While | ast.IfExp):
        yield _instead(node.test, f"(not ({_text(node.test, source)}))", source)


def _text(node: ast.expr, source: str) -> str:
    return ast.get_source_segment(source, node) or ""


def _instead(node: ast.expr, text: str, source: str) -> Mutant:
    end = (node.end_lineno or node.lineno, node.end_col_offset or 0)
    start = (node.lineno, node.col_offset)
    return Mutant(node.lineno, start, end, _text(node, source), text)


def _between(left: ast.expr, right: ast.expr, text: str | None, source: str) -> Iterator[Mutant]:
    """The operator that stands between two operands; brackets round them stay."""
    first, last = left.end_lineno or 0, right.lineno
    if text is None or first != last:
        return
    line = source.encode("utf-8").splitlines()[first - 1]
    begin, stop = left.end_col_offset or 0, right.col_offset
    gap = line[begin:stop].decode("utf-8")
    operator = gap.strip("() ")
    if operator and gap.count(operator) == 1:
        at = begin + len(gap[: gap.index(operator)].encode("utf-8"))
        end = at + len(operator.encode("utf-8"))
        # Spaces, because `a<b` may become `a not in b`.
        yield Mutant(first, (first, at), (first, end), operator, f" {text} ")
