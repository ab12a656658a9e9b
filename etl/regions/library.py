"""All texts of a study with their regions: which text a trial shows, which region a point hits."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from etl.errors import FaultError
from etl.regions.assign import Assigned, Manner, assign
from etl.regions.geometry import Floats, Geometry, Integers, Offsets, gather, offsets_of
from etl.regions.sources import Draft, Text


@dataclass(frozen=True, slots=True, eq=False)
class LabelTable:
    """Which region a label stands for, over all texts.

    Attributes
    ----------
    codes : dict of str to int
        Every label of the definitions, numbered from 0.
    places : (n,) int64 array
        ``text * len(codes) + code`` of each entry, ascending.
    orders : (n,) int32 array
        The order of each entry's region.
    """

    codes: dict[str, int]
    places: Offsets
    orders: Integers


@dataclass(frozen=True, slots=True, eq=False)
class RegionLibrary:
    """The texts of a study and their regions. Can be pickled; not to be changed.

    Attributes
    ----------
    keys : tuple of str
        The facts of a trial that say which text it shows.
    supplies : tuple of str
        Facts that only the definitions know; each text has its own.
    texts : tuple of Text, length T
        The texts, in the order of the file.
    region_names : tuple of str
        All distinct region names, in order of first appearance.
    region_count : (T,) int32 array
        How many regions each text has.
    region_offsets : (T + 1,) int64 array
        Where each text's regions start in ``region_code``.
    region_code : (sum of region_count,) int32 array
        Index into ``region_names`` of each text's regions, in reading order.
    text_of : dict of tuple of str to int
        The text for each combination of key values.
    geometry : Geometry or None
        Where the regions are; None where the log's labels say it.
    manner : Manner or None
        How points are taken to regions; None as above.
    labels : LabelTable or None
        What labels stand for; None where regions have places.
    sha256 : str
        Digest of the file of definitions as it was read, in hex; empty where there was none.
    """

    keys: tuple[str, ...]
    supplies: tuple[str, ...]
    texts: tuple[Text, ...]
    region_names: tuple[str, ...]
    region_count: Integers
    region_offsets: Offsets
    region_code: Integers
    text_of: dict[tuple[str, ...], int]
    geometry: Geometry | None
    manner: Manner | None
    labels: LabelTable | None
    sha256: str = ""

    def find(self, values: tuple[str, ...]) -> int:
        """The text that trials with these key values show; -1 where there is none.

        Parameters
        ----------
        values : tuple of str
            One value for each of ``keys``, in their order, without white space around it.

        Returns
        -------
        int
            Index into ``texts``.
        """
        return self.text_of.get(values, -1)

    def assign_points(
        self,
        text: NDArray[np.integer],
        x_px: Floats,
        y_px: Floats,
        line: Integers | None = None,
    ) -> Assigned:
        """Take points on the screen to regions.

        Parameters
        ----------
        text : (n,) integer array
            Index into ``texts`` for each point; -1 for none.
        x_px, y_px : (n,) float64 arrays
            Where the points are, from the left and from the top. NaN: no coordinate.
        line : (n,) int32 array, optional
            The line of each point where it is known, from 1; 0 for none, -1 where it is not known.

        Returns
        -------
        Assigned
            Order of each point's region (0 outside) and number of its line (0 on none). On a known
            line only x decides; a point on none is outside. Where the line is not known: laid-out
            text of one line: the point is on the line at the height of its box. Of several lines,
            or with a nearest line asked for: on the nearest. Boxes and polygons: on the line of the
            region hit, with a nearest line asked for on that. Without a coordinate: on none.

        Raises
        ------
        FaultError
            If the definitions are labels, or a text has no such line.

        Notes
        -----
        A point on the edge between two neighbours goes to the later one. Of boxes the right and
        bottom edge are not their own (of right-to-left text the left one); a polygon has all of
        its edges. On a line that is known, and with ``vertical = "any"``, a polygon is looked up at
        the height of its line's middle.
        """
        if self.geometry is None or self.manner is None:
            raise FaultError("regions known by labels were asked for points")
        if self.geometry.polygons is not None:
            shapely.prepare(self.geometry.polygons)
        return assign(
            self.geometry,
            self.manner,
            text,
            np.asarray(x_px, dtype=np.float64),
            np.asarray(y_px, dtype=np.float64),
            line,
        )

    @property
    def has_lines(self) -> bool:
        """Whether some text has several lines, which y tells apart."""
        if self.geometry is None or self.manner is None or self.manner.only_x:
            return False
        return bool((self.geometry.line_counts > 1).any())

    def assign_labels(
        self, text: NDArray[np.integer], label_code: NDArray[np.integer], labels: Sequence[str]
    ) -> Assigned:
        """Take the labels of a log to regions.

        Parameters
        ----------
        text : (n,) integer array
            Index into ``texts`` for each fixation; -1 for none.
        label_code : (n,) integer array
            Index into ``labels`` for each fixation; -1 where the log has none.
        labels : sequence of str
            The labels of the log.

        Returns
        -------
        Assigned
            Order of each fixation's region, 0 for a label that its text does not list. Labels
            say nothing about lines: all 0.

        Raises
        ------
        FaultError
            If the definitions are no labels.
        """
        if self.labels is None:
            raise FaultError("regions known by their places were asked for labels")
        order = np.zeros(len(text), dtype=np.int32)
        known = np.array([self.labels.codes.get(label, -1) for label in labels], dtype=np.int64)
        if len(known):
            code = np.where(label_code >= 0, known[label_code], -1)
            at = np.flatnonzero((code >= 0) & (text >= 0))
            wanted = text[at].astype(np.int64) * len(self.labels.codes) + code[at]
            entry = np.searchsorted(self.labels.places, wanted)
            entry = np.minimum(entry, len(self.labels.places) - 1)
            listed = self.labels.places[entry] == wanted
            order[at] = np.where(listed, self.labels.orders[entry], 0)
        return Assigned(order, np.zeros(len(text), dtype=np.int32))


def library_of(
    drafts: Sequence[Draft],
    keys: tuple[str, ...],
    supplies: tuple[str, ...],
    manner: Manner | None,
) -> RegionLibrary:
    """Put texts together.

    Parameters
    ----------
    drafts : sequence of Draft
        The texts, no two with the same keys; all with shapes, or all with labels.
    keys, supplies : tuple of str
        As in :class:`RegionLibrary`.
    manner : Manner or None
        How points are taken to regions; None for labels.

    Returns
    -------
    RegionLibrary
    """
    codes: dict[str, int] = {}
    region_code = [codes.setdefault(name, len(codes)) for d in drafts for name in d.text.regions]
    counts = [len(draft.text.regions) for draft in drafts]
    shapes = [draft.shape for draft in drafts if draft.shape is not None]
    return RegionLibrary(
        keys=keys,
        supplies=supplies,
        texts=tuple(draft.text for draft in drafts),
        region_names=tuple(codes),
        region_count=np.array(counts, dtype=np.int32),
        region_offsets=offsets_of(counts),
        region_code=np.array(region_code, dtype=np.int32),
        text_of={tuple(d.text.keys[key] for key in keys): i for i, d in enumerate(drafts)},
        geometry=gather(shapes) if shapes else None,
        manner=manner,
        labels=None if shapes else _label_table(drafts),
    )


def _label_table(drafts: Sequence[Draft]) -> LabelTable:
    """The labels of all texts in one sorted table."""
    codes: dict[str, int] = {}
    for draft in drafts:
        for label in draft.labels or {}:
            codes.setdefault(label, len(codes))
    entries = sorted(
        (text * len(codes) + codes[label], order)
        for text, draft in enumerate(drafts)
        for label, order in (draft.labels or {}).items()
    )
    return LabelTable(
        codes,
        np.array([place for place, _ in entries], dtype=np.int64),
        np.array([order for _, order in entries], dtype=np.int32),
    )
