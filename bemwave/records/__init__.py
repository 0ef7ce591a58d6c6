"""Records: the run folder, what is written to it, and a run opened again."""

from bemwave.records.checkpoint import Checkpoint, latest_checkpoint, write_checkpoint
from bemwave.records.checks_file import Verdict, read_checks, write_checks
from bemwave.records.folder import (
    RunFolder,
    checksums,
    create_folder,
    default_folder,
    refuse_used_folder,
    sync_files,
    whole,
)
from bemwave.records.history import History, HistoryFile
from bemwave.records.in_use import alone_in, refuse_links
from bemwave.records.manifest import Manifest, Rest, read_manifest, write_manifest
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
    "alone_in",
    "checksums",
    "create_folder",
    "default_folder",
    "latest_checkpoint",
    "open_run",
    "read_checks",
    "read_manifest",
    "refuse_links",
    "refuse_used_folder",
    "sync_files",
    "whole",
    "write_checkpoint",
    "write_checks",
    "write_manifest",
]
