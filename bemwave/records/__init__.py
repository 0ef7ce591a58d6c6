"""Records: the run folder, what is written to it, and a run opened again."""

from bemwave.records.checkpoint import Checkpoint, latest_checkpoint, write_checkpoint
from bemwave.records.checks_file import Verdict, read_checks, write_checks
from bemwave.records.folder import RunFolder, create_folder, default_folder, refuse_used_folder
from bemwave.records.history import History, HistoryFile
from bemwave.records.manifest import Manifest, Rest, hashes_of, read_manifest, write_manifest
from bemwave.records.run import Run, open_run
from bemwave.records.series import BodiesFile, GaugesFile

__all__ = [
    "BodiesFile",
    "Checkpoint",
    "GaugesFile",
    "History",
    "HistoryFile",
    "Manifest",
    "Rest",
    "Run",
    "RunFolder",
    "Verdict",
    "create_folder",
    "default_folder",
    "hashes_of",
    "latest_checkpoint",
    "open_run",
    "read_checks",
    "read_manifest",
    "refuse_used_folder",
    "write_checkpoint",
    "write_checks",
    "write_manifest",
]
