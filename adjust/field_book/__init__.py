"""The field book: a job folder of plain tables becomes a `Job`, or a list of what is wrong with it."""

from adjust.field_book.reading import read_job

__all__ = ["read_job"]
