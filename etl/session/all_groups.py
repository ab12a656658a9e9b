"""The work on all readers of a study, group after group."""

from __future__ import annotations

from collections import deque
from collections.abc import Generator, Iterator, Mapping

from etl.session.crew import Crew, Progress
from etl.session.gather import Gathered
from etl.session.group_work import GroupAnswer, GroupWork
from etl.session.reader_groups import GroupTask, group_sizes, group_tasks, without_values


def finish_groups(
    gathered: Gathered,
    crew: Crew,
    progress: Progress,
    formats: Mapping[str, tuple[str, ...]],
) -> Generator[GroupAnswer, None, None]:
    """Work on one group of readers after the other.

    Parameters
    ----------
    gathered : Gathered
        The readers.
    crew : Crew
        Does the work.
    progress : callable
        Told how many readers are done.
    formats : mapping of str to tuple of str
        For each table, the formats in which it is wanted; empty where only what is wrong is.

    Yields
    ------
    GroupAnswer
        In the order of the tables.
    """
    design, library, options, aside = gathered.bench()
    arguments = (without_values(design), library, options, aside, formats)
    names = gathered.tasks.participants
    sizes = group_sizes(names, [gathered.fixations[name] for name in names])
    under_way: deque[GroupTask] = deque()

    def tasks() -> Iterator[GroupTask]:
        for task in group_tasks(design, gathered.tasks, sizes):
            under_way.append(task)
            yield task

    place = {name: number for number, name in enumerate(design.files)}
    done = 0
    for answer in crew.map(GroupWork, arguments, tasks()):
        files = [place[name] for name in under_way.popleft().own.files]
        for tables in answer.readers:
            tables.name_files(files)
        yield answer
        done += len(answer.readers)
        progress("working on readers", done, len(names))
