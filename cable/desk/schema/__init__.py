"""The keys of a scenario, checked by pydantic: what may stand where, in which unit and limits."""

from cable.desk.schema.document import Document

__all__ = ["Document"]
