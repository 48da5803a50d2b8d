"""A verdict in letters that can be read at two metres, in plain characters."""

from benchlog.records import VerdictWord

_ROWS = 5
_LETTERS = {
    "A": (" ### ", "#   #", "#####", "#   #", "#   #"),
    "C": (" ####", "#    ", "#    ", "#    ", " ####"),
    "D": ("#### ", "#   #", "#   #", "#   #", "#### "),
    "F": ("#####", "#    ", "#### ", "#    ", "#    "),
    "I": ("#", "#", "#", "#", "#"),
    "L": ("#    ", "#    ", "#    ", "#    ", "#####"),
    "N": ("#   #", "##  #", "# # #", "#  ##", "#   #"),
    "O": (" ### ", "#   #", "#   #", "#   #", " ### "),
    "P": ("#### ", "#   #", "#### ", "#    ", "#    "),
    "S": (" ####", "#    ", " ### ", "    #", "#### "),
    "T": ("#####", "  #  ", "  #  ", "  #  ", "  #  "),
    "V": ("#   #", "#   #", "#   #", " # # ", "  #  "),
    " ": ("  ", "  ", "  ", "  ", "  "),
}
# A mark beside the word, so that neither colour nor reading is needed to tell them apart.
_MARKS = {
    "pass": "[ OK ]",
    "conditional pass": "[ OK? ]",
    "conditional fail": "[ X? ]",
    "invalid": "[ ?? ]",
    "fail": "[ X ]",
}
_SHORT = {"conditional pass": "COND PASS", "conditional fail": "COND FAIL"}


def large_verdict(word: VerdictWord, serial: str) -> str:
    """Return the word in block letters, with its mark and the serial below."""
    letters = [_LETTERS[letter] for letter in _SHORT.get(word, word.upper())]
    rows = ["  ".join(letter[row] for letter in letters).rstrip() for row in range(_ROWS)]
    drawn = "\n".join(f"   {row}" for row in rows)
    return f"\n{drawn}\n\n   {_MARKS[word]} {word.upper()}   serial {serial}\n"
