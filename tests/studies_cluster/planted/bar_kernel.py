"""A template's module without a kernel."""


def prepare() -> None:
    """Nothing to load."""


def serve(order, data) -> int:
    return 0
