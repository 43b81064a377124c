"""A draft and its files, as they are to be read."""

from server.intake.mapping import Mapping
from server.intake.parsing import Handed
from server.store import uploads
from server.store.connect import Session
from server.store.errors import Refused
from server.store.records import Upload


def handed(session: Session, upload: Upload) -> list[Handed]:
    """The files of an upload as they were handed in, with their mappings. Raises: Refused."""
    _require_mapped(upload)
    return [
        Handed(
            file.role,
            file.name,
            uploads.file_bytes(session, upload.id, file.role),
            Mapping.from_json(file.mapping),
        )
        for file in upload.files
    ]


def require_checkable(upload: Upload) -> None:
    """Raises: Refused where it is an edition already, or a file has no mapping yet."""
    require_draft(upload)
    _require_mapped(upload)


def require_draft(upload: Upload) -> None:
    """Raises: Refused where it is an edition already."""
    if upload.edition is not None:
        raise Refused(
            "Upload {upload} is edition {edition} already.",
            upload=upload.id,
            edition=upload.edition,
        )


def _require_mapped(upload: Upload) -> None:
    for file in upload.files:
        if not file.mapping:
            raise Refused(
                "The columns of {file} are not mapped yet. Say which column is which, then check "
                "the upload.",
                file=file.name,
            )
