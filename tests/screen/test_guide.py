from __future__ import annotations

from beforehand.screen.guide import page_text

SOURCE = """# influence

Rows that carry much are looked at one by one, with `cooks_distance` and the like, before any leaves.

## An example

    influence: {at_most: 5%}

```yaml
alpha: 0.05
```

- a first item that is long enough to be broken over two lines of the screen
1. a numbered one
"""


def test_a_page_is_wrapped_and_its_examples_are_left_alone() -> None:
    """Prose and lists are broken, examples are not, marks of the source are gone."""
    assert page_text(SOURCE, width=60) == (
        "influence\n"
        "  Rows that carry much are looked at one by one, with\n"
        "  cooks_distance and the like, before any leaves.\n"
        "\n"
        "An example\n"
        "    influence: {at_most: 5%}\n"
        "\n"
        "    alpha: 0.05\n"
        "\n"
        "  - a first item that is long enough to be broken over two\n"
        "    lines of the screen\n"
        "  1. a numbered one\n"
    )
