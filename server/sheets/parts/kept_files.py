"""An original that was kept, as a page names it."""

from server.records.queries.load_files import FileFact
from server.sheets.parts.telling import moment_words
from server.sheets.standard_lots import FileView


def file_view(found: FileFact, zone: str) -> FileView:
    """Return an original's name, address, size, hash, and who kept it when."""
    return FileView(
        name=found.name,
        url=f"/files/{found.id}",
        size=f"{max(1, round(found.size / 1000))} kB",
        sha256=found.sha256,
        kept=f"{moment_words(found.kept_at, zone)} by {found.kept_by}",
    )
