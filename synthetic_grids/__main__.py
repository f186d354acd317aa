"""`python -m synthetic_grids` writes every committed file of the invented ocean again."""

from __future__ import annotations

from synthetic_grids.make import make


def main() -> None:
    """Write the files and say how large each is."""
    for path in make():
        print(f"{path.parent.name}/{path.name}  {path.stat().st_size / 1e3:.0f} kB")


if __name__ == "__main__":
    main()
