"""The output folders of ``pacing debrief``: complete, or as they were."""

from __future__ import annotations

from pathlib import Path

import pandas as pd

from pacing.field.debrief import Debrief
from pacing.field.debrief_predict import Prediction
from pacing.field.season import TrackRecord
from pacing.report.debrief_picture import save_debrief_picture, save_prediction_picture
from pacing.report.debrief_report import debrief_document, prediction_document
from pacing.report.output_set import OutputKind, output_set
from pacing.report.strict_json import json_text

DEBRIEF_OUTPUT = OutputKind(
    names=frozenset({"debrief.json", "debrief.png", "cues.csv", "splits.csv"}),
    proof="debrief.json",
    schema="debrief/",
)
PREDICTION_OUTPUT = OutputKind(
    names=frozenset({"prediction.json", "prediction.png", "speed.csv"}),
    proof="prediction.json",
    schema="prediction/",
)


def write_debrief(debrief: Debrief, folder: Path, record: TrackRecord | None) -> None:
    """Write ``debrief.json``, ``debrief.png``, ``cues.csv`` and ``splits.csv`` as one set."""
    with output_set(folder, DEBRIEF_OUTPUT) as room:
        text = json_text(debrief_document(debrief, record))
        (room / "debrief.json").write_text(text, encoding="utf-8", newline="\n")
        _write_table(debrief.cues, room / "cues.csv")
        _write_table(debrief.splits, room / "splits.csv")
        save_debrief_picture(debrief, room / "debrief.png")


def write_prediction(prediction: Prediction, ride: str, folder: Path) -> None:
    """Write ``prediction.json``, ``prediction.png`` and ``speed.csv`` as one set."""
    with output_set(folder, PREDICTION_OUTPUT) as room:
        text = json_text(prediction_document(prediction, ride))
        (room / "prediction.json").write_text(text, encoding="utf-8", newline="\n")
        table = pd.DataFrame(
            {
                "at_m": prediction.at_m,
                "predicted_m_s": prediction.predicted_m_s,
                "ridden_m_s": prediction.ridden_m_s,
            }
        )
        _write_table(table, room / "speed.csv")
        save_prediction_picture(prediction, ride, room / "prediction.png")


def _write_table(table: pd.DataFrame, file: Path) -> None:
    table.round(6).to_csv(file, index=False, lineterminator="\n", encoding="utf-8")
