"""Component values as the trade writes them: spelling at random, and reading back, both apart from the program.

`spell` writes one value in one of many usual ways; `parse` reads any of them (and what a hookup file may hold).
"""

import re
from decimal import Decimal

PREFIX = {"p": Decimal("1e-12"), "n": Decimal("1e-9"), "u": Decimal("1e-6"), "m": Decimal("1e-3"), "": Decimal(1),
          "k": Decimal("1e3"), "K": Decimal("1e3"), "M": Decimal("1e6")}
UNIT_WORD = {"ohm": ("ohm", "\u03a9", "R"), "farad": ("F",), "henry": ("H",), "metre": ("m",)}
FOOT_IN_METRES = Decimal("0.3048")
# Prefixes in which a value of each unit is usually written, with their power of ten.
USUAL = {"ohm": (("", 0), ("k", 3), ("M", 6)), "farad": (("p", -12), ("n", -9), ("u", -6)),
         "henry": (("m", -3), ("", 0)), "metre": (("", 0),)}


def parse(value, unit):
    """The value in ohm, farad, henry or metre of what stands in a hookup file (text or a bare number)."""
    if isinstance(value, (int, float)) and not isinstance(value, bool):
        return float(value)
    text = value.strip().replace("\u00b5", "u").replace("\u03bc", "u").replace("\u2126", "\u03a9")
    factor = Decimal(1)
    if unit == "metre" and text.endswith("ft"):
        text, factor = text[:-2].strip(), FOOT_IN_METRES
    else:
        for word in UNIT_WORD[unit]:
            if text.endswith(word):
                text = text[: -len(word)].strip()
                break
    code = re.fullmatch(r"(\d+)([pnumRkKMFH])(\d+)", text)  # IEC 60062: the letter stands for the decimal point
    if code:
        letter = "" if code[2] in "RFH" else code[2]
        return float(Decimal(f"{code[1]}.{code[3]}") * PREFIX[letter])
    plain = re.fullmatch(r"([0-9.]+(?:[eE][-+]?\d+)?) ?([pnumkKM]?)", text)
    if not plain:
        raise ValueError(f"{value!r} is not a value in {unit}")
    return float(Decimal(plain[1]) * PREFIX[plain[2]] * factor)


def spell(rng, digits, exponent, unit):
    """TOML text (quoted, or a bare number now and then) of digits * 10^exponent in base units, 1 <= digits < 1000."""
    value = Decimal(digits).scaleb(exponent)
    words = UNIT_WORD[unit][:2]
    forms = []
    for prefix, power in USUAL[unit]:
        shown = value.scaleb(-power)
        if not Decimal("0.001") <= shown < Decimal("10000"):
            continue
        number = f"{shown.normalize():f}"
        for gap in ("", " "):
            forms.append(f"{number}{gap}{prefix}{rng.choice(words)}")
        if prefix or unit != "metre":
            forms.append(f"{number}{prefix}")
        if prefix == "k":
            forms.append(f"{number}K")
        if prefix == "u":
            forms += [f"{number} \u00b5F", f"{number}\u03bcF"]
        if re.fullmatch(r"\d+\.\d\d?", number) and prefix:
            forms.append(number.replace(".", prefix))
        if "." in number and prefix == "" and unit == "ohm":
            forms.append(number.replace(".", "R"))
    if not forms:
        forms.append(f"{value:.6e}")
    if unit in ("ohm", "henry") and rng.random() < 0.1:
        return f"{value.normalize():f}"  # a bare TOML number
    return f'"{rng.choice(forms)}"'


def draw(rng, low, high, unit, tidy=2):
    """A value between low and high, even in log, of `tidy` significant digits. Returns its TOML text."""
    import math
    target = math.exp(rng.uniform(math.log(low), math.log(high)))
    exponent = math.floor(math.log10(target)) - (tidy - 1)
    digits = max(1, round(target / 10.0**exponent))
    return spell(rng, digits, exponent, unit)
