"""What labs call the columns of their logs: words of a few languages for each meaning."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable


def word_set(text: str) -> frozenset[str]:
    """Words that stand between blanks, as a set.

    Examples
    --------
    >>> sorted(word_set("pear plum"))
    ['pear', 'plum']
    """
    return frozenset(text.split())


#: Words for each meaning, folded as :func:`words_of` folds a header: English, German, French,
#: Spanish, Portuguese, Italian, Chinese and Japanese, and abbreviations common in the trade (common
#: practice, no source). A phrase counts where all its words stand in the header.
_WORDS: dict[str, str] = {
    "participant": """
        participant participants subject subj subjid sub reader readerid person proband
        versuchsperson vp vpn vpnr pbn teilnehmer teilnehmerin leser sujet lecteur participante
        sujeto lector sujeito leitor partecipante soggetto lettore observer pp ppt ppn pid id code
        respondent who wer
        被试 受试者 参与者 被験者 参加者
    """,
    "trial": """
        trial trialno trialnr trialnum trialid trialindex trl tr durchgang durchgangsnr essai
        ensayo ensaio prova tentativa 试次 試行
    """,
    "item": """
        item itemno itemid itemnr sentence sent sentenceid sentid stimulus stim stimulusid text
        textid textnr passage note satz satznr reiz phrase frase oracion texte texto testo
        enunciado estimulo stimolo material
        句子 句 材料 项目 文章 刺激
    """,
    "session": """
        session sess ses sessionid visit sitzung termin seance visite sesion visita sessao
        sessione 会话 场次 セッション
    """,
    "onset": """
        onset start starttime starts begin began beginning from tstart fixstart fixonset
        onsettime timestamp time zeit beginn anfang startzeit debut temps inicio tiempo comienzo
        tempo inizio t timestart
        开始 开始时间 起始 时间 開始
    """,
    "end": """
        end endtime stop ends offset finish until tend tstop fixend ende endzeit schluss fin final
        fim fine 结束 结束时间 終了
    """,
    "duration": """
        duration dur fixdur fixduration durationms length dauer fixationsdauer fixdauer duree
        duracion duracao durata 时长 持续时间 注视时间 注视时长 時間長
    """,
    "x": """
        x gx xpos posx gazex xgaze fixx xfix avgx meanx xcoord xpx xcoordinate xposition
        horizontal 横坐标
    """,
    "y": """
        y gy ypos posy gazey ygaze fixy yfix avgy meany ycoord ypx ycoordinate yposition vertical
        纵坐标
    """,
    "fixation": """
        fixation fix fixno fixnr fixnum fixindex fixid fixationno fixationindex n no nr num number
        index nummer numero rang rank ordinal 序号 注视序号 番号
    """,
    "eye": "eye eyes auge augen oeil œil ojo olho occhio side seite 眼 眼睛 左右眼",
    "blink": """
        blink blinks blinking lidschlag blinzeln clignement parpadeo piscada ammiccamento 眨眼
    """,
    "label": """
        area aoi aoiname roi region label zone bereich gebiet wort word mot palabra palavra parola
        etikett etiquette etiqueta etichetta section part 区域 兴趣区 词
    """,
    "event": "event type eventtype kind ereignis typ art evenement evento tipo 事件 类型",
}

#: Words that say little by themselves: a header is the more a phrase, the less else it holds.
_FILLERS = word_set(
    """
    fixation fix fixations gaze the of in a no nr num number index id name mean
    avg average raw pos position coord coordinate coordinates screen time t log my ms msec s
    sec us px pixel pixels deg degrees millisec milliseconds seconds local global abs rel der
    des von de la le du del 注视 坐标
    """
)

#: Words that make a header mean something else than it seems to say.
_ELSEWHERE: dict[str, frozenset[str]] = {
    "any": word_set(
        """
        saccade sacc sac sakkade sacade pupil pupille pupila velocity speed amplitude amp angle
        next prev previous last count total sum sd std var variance percent rate answer response
        resp rt key button drift calibration error confidence velocidad frequency peak
        """
    ),
    "onset": word_set("x y text textonset trial blink"),
    "end": word_set("x y text trial blink"),
    "duration": word_set("x y trial text blink"),
    "x": frozenset(["start", "end", "y"]),
    "y": frozenset(["start", "end", "x"]),
    "fixation": word_set(
        """
        trial sentence item text subject participant reader word region area line block session
        start end onset duration dur dauer duree x y start end page
        """
    ),
    "trial": word_set("start end onset offset time type condition duration"),
    "participant": word_set(
        "trial item sentence text stimulus word region area fixation group age"
    ),
    "item": word_set("length onset offset time word type condition"),
    "session": frozenset(["time", "date"]),
    "label": word_set("left right top bottom width height start end index number"),
    "eye": frozenset(["x", "y", "movement"]),
    "blink": word_set("onset start end duration dur"),
}
_NO_LETTERS = re.compile(r"[\W_]+")
_HUMPS = re.compile(r"(?<=[a-z0-9])(?=[A-Z])|(?<=[A-Z])(?=[A-Z][a-z])")
_DIGITS = re.compile(r"(?<=[^\W\d_])(?=\d)|(?<=\d)(?=[^\W\d_])")
_IN_BRACKETS = re.compile(r"[\[({]\s*([^\[\](){}]*?)\s*[\])}]")
#: How units are spelled in headers.
_UNITS = {
    "ms": "ms msec millis millisec milliseconds millisecond millisekunden",
    "s": "s sec secs second seconds sekunden secondes segundos",
    "us": "us µs μs usec microsec microseconds mikrosekunden",
    "px": "px pix pixel pixels píxeles",
    "deg": "deg degree degrees ° dva grad",
}
_UNIT_OF = {word: unit for unit, words in _UNITS.items() for word in words.split()}
#: From this length on, a word is found inside a longer one, as in compound nouns.
_LONG_WORD = 6


def _folded(text: str) -> str:
    """Text without accents, in small letters."""
    apart = unicodedata.normalize("NFKD", text)
    return "".join(c for c in apart if not unicodedata.combining(c)).casefold()


def words_of(header: str) -> tuple[str, ...]:
    """The words of a header, folded: no accents, small letters, apart at signs and capitals.

    Parameters
    ----------
    header : str
        As it stands in the log.

    Returns
    -------
    tuple of str

    Examples
    --------
    >>> words_of("FixDur_ms"), words_of("Durée [ms]")
    (('fix', 'dur', 'ms'), ('duree', 'ms'))
    """
    parts = _NO_LETTERS.sub(" ", header)
    parts = _DIGITS.sub(" ", _HUMPS.sub(" ", parts))
    return tuple(_folded(parts).split())


def unit_in(header: str) -> str | None:
    """The unit that a header names, in brackets or as its last word.

    Parameters
    ----------
    header : str
        As it stands in the log.

    Returns
    -------
    {"ms", "s", "us", "px", "deg"} or None
        None where it names none.

    Examples
    --------
    >>> unit_in("dur [ms]"), unit_in("start_s"), unit_in("gaze_x")
    ('ms', 's', None)
    """
    for bracketed in _IN_BRACKETS.findall(header):
        unit = _UNIT_OF.get(bracketed.strip(" .").casefold())
        if unit is not None:
            return unit
    words = _NO_LETTERS.sub(" ", header.casefold()).split()
    return _UNIT_OF.get(words[-1]) if len(words) > 1 else None


def likeness(header: str, meaning: str) -> float:
    """How much a header sounds like a meaning.

    Parameters
    ----------
    header : str
        As it stands in the log.
    meaning : str
        A canonical name, or ``"event"``.

    Returns
    -------
    float
        From 0 (not at all) to 1 (it says nothing else).

    Examples
    --------
    >>> likeness("dur_ms", "duration"), likeness("answer", "duration")
    (1.0, 0.0)
    """
    words = words_of(header)
    whole = "".join(words)
    vocabulary = _VOCABULARY[meaning]
    said = [word for word in words if word in vocabulary]
    inside = [word for word in vocabulary if len(word) >= _LONG_WORD and word in whole]
    inside += [word for word in vocabulary if not word.isascii() and word in whole]
    if not said and whole not in vocabulary and not inside:
        return 0.0
    strays = [word for word in words if word not in vocabulary and word not in _FILLERS]
    if inside and not said:
        strays = [word for word in strays if not any(part in word for part in inside)]
    # A filler alone, such as a number, is the weakest of names.
    own = [word for word in said if word not in _FILLERS] or inside or whole in vocabulary
    score = 1.0 if own else 0.6
    score *= 0.75 ** sum(not word.isdigit() for word in strays)
    elsewhere = _ELSEWHERE["any"] | _ELSEWHERE.get(meaning, frozenset())
    if any(word in elsewhere and word not in vocabulary for word in words) or (
        any(whole in other for other in _VOCABULARY.values()) and whole not in vocabulary
    ):
        score *= 0.25
    return score


def sounds_like(header: str, meanings: Iterable[str]) -> str | None:
    """The meaning that a header sounds most like.

    Parameters
    ----------
    header : str
        As it stands in the log.
    meanings : iterable of str
        Among which.

    Returns
    -------
    str or None
        None where it sounds like none of them.
    """
    best = max(((likeness(header, one), one) for one in meanings), default=(0.0, ""))
    return best[1] if best[0] > 0 else None


_VOCABULARY = {meaning: word_set(words) for meaning, words in _WORDS.items()}
