"""The sentences of the orchard study: notes on the board of an invented community orchard.

Each has a topic that fits its verb and one that does not; the verb and all that follows it are the
same in both versions, so that only the fit differs. The time cue opens the sentence or closes it.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Sentence:
    """The parts of one item; ``place`` and ``tail`` may be empty, the tail lies in no region."""

    cue: str
    fitting: str
    odd: str
    auxiliary: str
    verb: str
    spillover: str
    place: str = ""
    tail: str = ""

    def marked(self, cue: str, fit: str) -> str:
        """One version of the sentence with its regions marked.

        Examples
        --------
        >>> SENTENCES[0].marked("late", "fitting")[:48]
        '{topic: The rusty saw} {auxiliary: was carefully'
        """
        topic = self.fitting if fit == "fitting" else self.odd
        parts = [
            ("topic", topic),
            ("auxiliary", self.auxiliary),
            ("verb", self.verb),
            ("spillover", self.spillover),
        ]
        if self.place:
            parts.append(("place", self.place))
        if cue == "early":
            parts.insert(0, ("when", self.cue + ","))
        else:
            parts.append(("when", self.cue))
        first, words = parts[0]
        parts[0] = first, words[0].upper() + words[1:]
        if not self.tail:
            last, words = parts[-1]
            parts[-1] = last, words + "."
        marked = " ".join(f"{{{name}: {words}}}" for name, words in parts)
        return f"{marked} {self.tail}." if self.tail else marked


SENTENCES = (
    Sentence(
        "before lunch", "the rusty saw", "the ripe plum",
        "was carefully", "sharpened", "by the warden", "in the tool shed",
    ),
    Sentence(
        "on Monday morning", "the long ladder", "the fresh cider",
        "was finally", "mended", "by two volunteers", "behind the barn", "as promised",
    ),
    Sentence(
        "after the storm", "the broken fence", "the cold lemonade",
        "was quickly", "rebuilt", "by the neighbours", "along the lane",
    ),
    Sentence(
        "last autumn", "the sweetest pears", "the garden gates",
        "were slowly", "peeled", "by the children", "at a long table",
    ),
    Sentence(
        "in early spring", "the young cherry trees", "the paper lanterns",
        "were neatly", "pruned", "by the new gardener", "near the pond",
    ),
    Sentence(
        "on the open day", "the apple juice", "the wooden bench",
        "was slowly", "poured", "by the treasurer", "into small cups",
    ),
    Sentence(
        "last Friday", "the garden shed", "the plum jam",
        "was brightly", "painted", "by the youngest member", "with a broad brush",
    ),
    Sentence(
        "every evening", "the thirsty seedlings", "the metal rakes",
        "were generously", "watered", "by the caretaker", "", "until the rain came",
    ),
    Sentence(
        "at noon", "the heavy wheelbarrow", "the evening song",
        "was carefully", "loaded", "by three visitors", "beside the gate", "once again",
    ),
    Sentence(
        "in October", "the last quinces", "the spare buckets",
        "were gently", "baked", "by the kitchen team", "for the harvest supper",
    ),
    Sentence(
        "before the meeting", "the muddy boots", "the ripe figs",
        "were hastily", "unlaced", "by the hikers", "at the door",
    ),
    Sentence(
        "during the holidays", "the fresh honey", "the tall hedge",
        "was patiently", "strained", "by the beekeeper", "into glass jars",
    ),
    Sentence(
        "on Sunday afternoon", "the long lawn", "the apple tart",
        "was evenly", "mown", "by the retired teacher", "from end to end",
    ),
    Sentence(
        "before dark", "the empty crates", "the morning clouds",
        "were tidily", "stacked", "by the pickers", "under the roof", "as usual",
    ),
    Sentence(
        "after breakfast", "the noisy geese", "the clay pots",
        "were calmly", "fed", "by the twins", "near the stream",
    ),
    Sentence(
        "on Saturday", "the fallen apples", "the iron hinges",
        "were eagerly", "eaten", "by the blackbirds", "under the oldest tree",
    ),
    Sentence(
        "at the last meeting", "the yearly report", "the garden hose",
        "was briefly", "summarised", "by the secretary", "for the newcomers",
    ),
    Sentence(
        "two days ago", "the iron gate", "the bean soup",
        "was expertly", "welded", "by the blacksmith", "in the yard",
    ),
    Sentence(
        "in the afternoon", "the dry leaves", "the loud bells",
        "were patiently", "raked", "by the students", "into heaps", "to make compost",
    ),
    Sentence(
        "during the workshop", "the willow basket", "the cold well water",
        "was skilfully", "woven", "by a beginner", "in one hour",
    ),
    Sentence(
        "before the frost", "the pear shoots", "the brass keys",
        "were expertly", "grafted", "by the head gardener", "onto strong stems",
    ),
    Sentence(
        "late last night", "the injured hedgehog", "the gravel path",
        "was gently", "bandaged", "by a passing vet", "in the warm office",
    ),
    Sentence(
        "at the picnic", "the short poem", "the wet raincoat",
        "was proudly", "recited", "by the smallest girl", "from memory",
    ),
    Sentence(
        "over the summer", "the sour cherries", "the steep steps",
        "were slowly", "pickled", "by the cook", "in jars", "for the winter shop",
    ),
    Sentence(
        "in the new year", "the crooked shed", "the gentle breeze",
        "was finally", "demolished", "by the builders", "with borrowed tools",
    ),
    Sentence(
        "yesterday", "the ripe apricots", "the window panes",
        "were happily", "picked", "by the nursery class", "from the low branches",
    ),
    Sentence(
        "on the first day", "the new visitors", "the garden shears",
        "were kindly", "greeted", "by the hostess", "at the gate", "with warm bread",
    ),
    Sentence(
        "before sunrise", "the tired donkey", "the rain barrel",
        "was carefully", "saddled", "by the farmer", "in the stable", "once more",
    ),
    Sentence(
        "in the morning", "the damp blankets", "the deep puddles",
        "were quickly", "folded", "by the campers",
    ),
    Sentence(
        "after the harvest", "the surplus walnuts", "the summer breezes",
        "were noisily", "cracked", "by the grandparents", "on the porch",
    ),
    Sentence(
        "during the interview", "the difficult question", "the copper kettle",
        "was honestly", "answered", "by the founder", "without any notes",
    ),
    Sentence(
        "on market day", "the fresh eggs", "the narrow bridges",
        "were carefully", "boiled", "by the stallholder", "for hungry customers",
    ),
)  # fmt: skip

PRACTICE = (
    "Please close the lower gate so that the sheep stay out of the flower beds.",
    "The water in the green barrel is not for drinking, but the tap by the shed is safe.",
    "Somebody left a blue scarf on the bench near the pond last week.",
    "A map of all the paths hangs on the wall next to the front door.",
)

FILLERS = (
    "Most of the older trees were planted long before the road was built.",
    "Whoever borrowed the small hammer is kindly asked to bring it back.",
    "The owls in the barn have raised four chicks this year.",
    "Children under ten may climb only the trees that carry a white ribbon.",
    "We are still looking for someone who can play the fiddle at the fair.",
    "The path along the stream will stay closed until the mud has dried.",
    "Bring your own bottles if you would like to take some juice home.",
    "The next meeting starts an hour earlier because the days are getting shorter.",
)
