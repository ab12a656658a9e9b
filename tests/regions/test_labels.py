"""Labels that the log carries in place of coordinates."""

from __future__ import annotations

import unicodedata
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from etl.errors import FaultError

Read = Callable[..., Any]
NO_KEY = "label,region,order\nV1,verb,2\nV2,verb,2\nS,subject,1\n"
BY_ITEM = "item,label,region,order\n1,A,start,1\n2,A,end,2\n2,B,start,1\n"


def test_labels_share_a_region_and_unlisted_ones_are_outside(read: Read) -> None:
    """Several labels may stand for one region; a label not listed, or missing, is outside."""
    library = read("labels", NO_KEY).library
    labels = ["S", "V2", "sky", "V1", "never fixated"]
    code = np.array([0, 1, 2, 3, -1, 1], dtype=np.int32)
    got = library.assign_labels(np.zeros(6, dtype=np.int32), code, labels)
    assert got.order.tolist() == [1, 2, 0, 2, 0, 2]
    assert got.line.tolist() == [0] * 6


def test_label_means_what_its_own_text_says(read: Read) -> None:
    """The same label may stand for different regions in different texts."""
    library = read("labels", BY_ITEM).library
    text = np.array([0, 1, 0, 1, -1], dtype=np.int32)
    code = np.array([0, 0, 1, 1, 0], dtype=np.int32)
    assert library.assign_labels(text, code, ["A", "B"]).order.tolist() == [1, 2, 0, 1, 0]


def test_library_of_labels_lists_regions_in_order(read: Read) -> None:
    """Regions in reading order, each once, without lines on a screen."""
    library = read("labels", NO_KEY).library
    (text,) = library.texts
    assert (text.regions, text.lines, library.region_count.tolist()) == (
        ("subject", "verb"),
        0,
        [2],
    )


def test_log_without_any_label_is_outside_throughout(read: Read) -> None:
    """No labels at all is no fault."""
    library = read("labels", NO_KEY).library
    code = np.full(2, -1, dtype=np.int32)
    assert library.assign_labels(np.zeros(2, dtype=np.int32), code, []).order.tolist() == [0, 0]


def test_labels_have_no_places(read: Read) -> None:
    """Points cannot be taken to labels: a fault of the program, not of the input."""
    library = read("labels", NO_KEY).library
    with pytest.raises(FaultError, match="regions known by labels were asked for points"):
        library.assign_points(np.zeros(1, dtype=int), np.zeros(1), np.zeros(1))


def test_places_have_no_labels(read: Read) -> None:
    """Labels cannot be taken to boxes: a fault of the program, not of the input."""
    library = read("words", "item,text\n1,pear\n").library
    with pytest.raises(FaultError, match="regions known by their places were asked for labels"):
        library.assign_labels(np.zeros(1, dtype=int), np.zeros(1, dtype=int), ["A"])


def test_label_that_is_a_missing_mark_is_an_error(read: Read) -> None:
    """No fixation can have such a label, so the file and the study file contradict each other."""
    got = read("labels", NO_KEY + "NA,object,3\n")
    assert got.library is None
    assert got.text == (
        'regions.csv:5: column "label": the label "NA" is a mark for no value too, so no fixation '
        'can have it; found "NA", expected a label that is not in [logs] missing\n'
        '    fix: take "NA" out of [logs] missing of the study file, or rename the label here and '
        "in the logs\n"
        "1 problem; nothing was written"
    )


def test_labels_and_names_are_composed(read: Read) -> None:
    """Letters with accents are equal however the file composes them."""
    apart = unicodedata.normalize("NFD", "m\u00fchle")
    got = read("labels", f"label,region,order\n{apart},{apart},1\n")
    assert got.library.region_names == ("m\u00fchle",)
    assert list(got.library.labels.codes) == ["m\u00fchle"]


def test_missing_mark_is_no_fact(read: Read) -> None:
    """A fact that the file supplies is missing where the cell holds a missing mark."""
    content = "item,cue,label,region,order\n1,NA,A,a,1\n2,early,A,a,1\n1,,B,b,2\n"
    got = read("labels", content, wanted=("cue",))
    assert [text.facts["cue"] for text in got.library.texts] == ["", "early"]
