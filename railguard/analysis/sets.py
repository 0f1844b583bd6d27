"""Nets joined into groups."""


class Sets:
    """Names joined into groups, each known by one of its members."""

    def __init__(self) -> None:
        """Begin with every name by itself."""
        self._parent: dict[str, str] = {}

    def find(self, name: str) -> str:
        """Return the member a group is known by."""
        parent = self._parent
        root = name
        while (up := parent.get(root, root)) != root:
            root = up
        while (up := parent.get(name, name)) != root:
            parent[name], name = root, up
        return root

    def join(self, a: str, b: str) -> bool:
        """Join two groups; False where they already were one."""
        ra, rb = self.find(a), self.find(b)
        if ra == rb:
            return False
        self._parent[ra] = rb
        return True

    def copy(self) -> "Sets":
        """Return the same groups, to be joined further without changing these."""
        other = Sets()
        other._parent = dict(self._parent)
        return other
