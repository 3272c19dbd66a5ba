"""The colours of the pictures, one place for all of them.

The eight hues are the set for readers with any kind of colour vision by Okabe
and Ito, "Color Universal Design", 2002, revised 2008 (the work from memory, the
values equal matplotlib's "okabe_ito" sequence); which stands for what is our
choice. Maps of a quantity use
matplotlib's "cividis" (Nunez, Anderton and Renslow, PLoS ONE 13, 2018,
e0199239), which reads the same with red-green colour blindness and in grey.
"""

BLACK = "#000000"
ORANGE = "#E69F00"
SKY = "#56B4E9"
GREEN = "#009E73"
YELLOW = "#F0E442"
BLUE = "#0072B2"
VERMILION = "#D55E00"
PURPLE = "#CC79A7"

PHASE = {
    "austenite": VERMILION,
    "ferrite": YELLOW,
    "cementite": BLACK,
    "pearlite": GREEN,
    "bainite": ORANGE,
    "martensite": BLUE,
}
PHASE_LABEL = {
    "austenite": "retained austenite",
    "ferrite": "ferrite",
    "cementite": "cementite",
    "pearlite": "pearlite",
    "bainite": "bainite",
    "martensite": "martensite",
}
LINES = (BLUE, VERMILION, GREEN, PURPLE, ORANGE, SKY, BLACK)
DASHES = ("solid", "dashed", "dashdot", "dotted")
MARKS = ("o", "s", "^", "D")
GUIDE = "#5A5A5A"
GRID = "#D8D8D8"
MAP = "cividis"
