"""Letters for groups that cannot be told apart: the compact letter display (Piepho, J. Comput.
Graph. Stat. 13 (2004) 456).

The groups are the largest sets of names without a difference inside, the maximal cliques of "does
not differ" (Bron and Kerbosch with a pivot, which does not walk through the subsets of a group).
Two names share a letter exactly where they do not differ.
"""

from __future__ import annotations

from collections.abc import Sequence


def group_letters(names: Sequence[str], differ: set[frozenset[str]]) -> dict[str, str]:
    """Letters by name; `names` from best to worst, "a" goes to the group of the best."""
    count = len(names)
    alike = [
        {j for j in range(count) if j != i and frozenset((names[i], names[j])) not in differ}
        for i in range(count)
    ]
    groups: list[list[int]] = []

    def grow(group: list[int], open_to: set[int], seen: set[int]) -> None:
        if not open_to and not seen:
            groups.append(sorted(group))
            return
        pivot = max(sorted(open_to | seen), key=lambda i: len(alike[i] & open_to))
        for i in sorted(open_to - alike[pivot]):
            grow([*group, i], open_to & alike[i], seen & alike[i])
            open_to.remove(i)
            seen.add(i)

    grow([], set(range(count)), set())
    letters = dict.fromkeys(names, "")
    for number, group in enumerate(sorted(groups)):
        for i in group:
            letters[names[i]] += _letter(number)
    return letters


def _letter(number: int) -> str:
    alphabet = "abcdefghijklmnopqrstuvwxyz"
    return alphabet[number] if number < len(alphabet) else f"{alphabet[number % 26]}{number // 26}"
