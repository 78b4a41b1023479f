"""Exports of loggers to blocks of samples: text to numbers, with file and line kept, streaming.

What a file is (encoding, delimiter, headings, units, stamps) is recognised from pieces of all files of
an export; whatever the plant file declares is held against it. Every line of every file and every
cell of a bound column is accounted for. Nothing is repaired, averaged or resolved here.
"""

from auditor.log_reading.listing import hash_files
from auditor.log_reading.notes import recognition_notes
from auditor.log_reading.reading import read_export
from auditor.log_reading.recognition import RecognisedFile, Recognition, recognise

__all__ = [
    "RecognisedFile",
    "Recognition",
    "hash_files",
    "read_export",
    "recognise",
    "recognition_notes",
]
