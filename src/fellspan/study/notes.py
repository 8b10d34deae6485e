"""Notes made while a study is put together. Words only."""


def position_note(site_name: str, caution: str) -> str:
    """What is doubtful about the position of a site."""
    return f"site '{site_name}': {caution}"
