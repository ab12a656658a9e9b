"""Damage of any kind to any file: it is read or refused, and is never a fault of the program."""

import shutil

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tests.bad_input.small_study import SmallStudy

FILES = ("logs/P01.tsv", "regions.csv", "participants.csv", "trial_list.csv")
#: What may come into a file by a slip of the hand, a wrong export or a broken disk.
PIECES = [*'\t\n\r",.;-09# {}', "\x00", "NA", "nan", "1e300", "P01", "é"]


@st.composite
def damages(draw: st.DrawFn) -> tuple[str, list[tuple[float, int, bytes]]]:
    """A file, and where bytes of it are replaced by others."""
    piece = st.sampled_from(PIECES).map(lambda text: text.encode("utf-8")) | st.binary(max_size=3)
    place = st.tuples(st.floats(0, 1), st.integers(0, 6), piece)
    return draw(st.sampled_from(FILES)), draw(st.lists(place, min_size=1, max_size=4))


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=60)
@given(damages())
def test_damage_is_read_or_refused(
    study: SmallStudy, damage: tuple[str, list[tuple[float, int, bytes]]]
) -> None:
    """A damaged file ends in tables or in a list of problems that leaves everything as it was."""
    for path in study.folder.iterdir():
        shutil.rmtree(path) if path.is_dir() else path.unlink()
    SmallStudy.sound(study.folder).add_tables()
    name, places = damage
    content = (study.folder / name).read_bytes()
    for where, length, piece in places:
        at = int(where * len(content))
        content = content[:at] + piece + content[at + length :]
    study.write(name, content)
    before = study.content()
    result = study.run("build", "study.toml")
    assert result.exit_code in (0, 2), result.stderr
    if result.exit_code == 2:
        assert result.stdout == ""
        assert study.content() == before
