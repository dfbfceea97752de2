"""Numbers as sections of digits show them: General, decimals, exponents, fractions."""

from __future__ import annotations

from decimal import ROUND_HALF_UP, Context, Decimal
from fractions import Fraction
from functools import lru_cache
from typing import Final

from xleq.recalc.formats.sections import Section, Token

_WIDE: Final = Context(prec=400, rounding=ROUND_HALF_UP)
_ZERO: Final = Decimal(0)


def exact_digits(x: float) -> Decimal:
    """The number at 15 significant digits, which is what a format sees."""
    return Decimal(f"{x:.14e}")


def rounded(x: Decimal, places: int) -> Decimal:
    """Rounded half away from zero; negative `places` round before the point."""
    return x.quantize(Decimal(1).scaleb(-places), context=_WIDE)


@lru_cache(maxsize=4096)
def general_text(x: float) -> str:
    """Text of a number in the General format: up to 11 characters beside the sign.

    Examples
    --------
    >>> general_text(1 / 3), general_text(123456789012.0), general_text(-2.5e-9), general_text(1e-8)
    ('0.333333333', '1.23457E+11', '-2.5E-09', '0.00000001')
    """
    d = exact_digits(abs(x))
    sign = "-" if x < 0 else ""
    if d == 0:
        return "0"
    exponent = d.adjusted()
    if exponent <= 10:
        plain = rounded(d, min(9, 10 - exponent - 1) if exponent > 0 else 9)
        if exponent == 10:
            plain = rounded(d, 0)
        exact = plain == d
        if plain.adjusted() <= 10 and (exponent >= -4 or exact):
            text = f"{plain:f}"
            return sign + (text.rstrip("0").rstrip(".") if "." in text else text)
    digits, power = f"{_WIDE.create_decimal(d):.5E}".split("E")
    digits = digits.rstrip("0").rstrip(".")
    return f"{sign}{digits}E{power[0]}{power[1:].zfill(2)}"


def number_section(x: float, section: Section) -> tuple[str, bool]:
    """Text of a number without its sign, and whether any digit other than 0 was shown."""
    if section.has("exponent"):
        return _scientific(exact_digits(abs(x)), section.tokens)
    if _slash_of_fraction(section.tokens) is not None:
        return _fraction_text(exact_digits(abs(x)), section.tokens)
    return _decimal(exact_digits(abs(x)), section.tokens)


def _decimal(d: Decimal, tokens: tuple[Token, ...]) -> tuple[str, bool]:
    whole, fraction, thousands, scale = _laid_out(tokens)
    percents = sum(t.kind == "percent" for t in tokens)
    places = sum(t.kind == "digit" for t in fraction or ())
    d = rounded(d.scaleb(2 * percents - 3 * scale, context=_WIDE), places)
    digits, _, decimals = f"{d:f}".partition(".")
    text = _whole_text(digits.lstrip("0"), whole, thousands, fraction is not None)
    if fraction is not None:
        text += "." + _decimals_text(decimals, fraction)
    return text, d != 0


def _laid_out(tokens: tuple[Token, ...]) -> tuple[list[Token], list[Token] | None, bool, int]:
    """Tokens before and after the point, whether thousands are separated, commas that divide by 1000."""
    point = next((i for i, t in enumerate(tokens) if t.kind == "point"), None)
    before = list(tokens if point is None else tokens[:point])
    after = None if point is None else list(tokens[point + 1 :])
    scale = 0
    for part in (before, after or []):
        last = max((i for i, t in enumerate(part) if t.kind == "digit"), default=None)
        while last is not None and last + 1 < len(part) and part[last + 1].kind == "comma":
            scale += 1
            del part[last + 1]
    first = next((i for i, t in enumerate(before) if t.kind == "digit"), len(before))
    thousands = any(t.kind == "comma" for t in before[first:])
    before = [
        Token("literal", ",") if t.kind == "comma" and i < first else t
        for i, t in enumerate(before)
        if t.kind != "comma" or i < first
    ]
    return before, after, thousands, scale


def _whole_text(digits: str, tokens: list[Token], thousands: bool, pointed: bool) -> str:
    holders = sum(t.kind == "digit" for t in tokens)
    if not holders:
        literal = "".join(t.text for t in tokens)
        return literal + digits if pointed else literal
    out: list[str] = []
    place = 0
    for token in reversed(tokens):
        if token.kind != "digit":
            out.append(_shown(token))
            continue
        holders -= 1
        taken = digits[-1:] if holders else digits
        digits = digits[:-1] if holders else ""
        for c in reversed(taken or {"0": "0", "#": "", "?": " "}[token.text]):
            if thousands and place and place % 3 == 0:
                out.append("," if c != " " else " ")
            out.append(c)
            place += 1
    return "".join(reversed(out))


def _shown(token: Token) -> str:
    return token.text if token.kind in ("literal", "percent", "slash", "comma", "era", "point") else ""


def _decimals_text(decimals: str, tokens: list[Token]) -> str:
    holders = [t.text for t in tokens if t.kind == "digit"]
    kept = len(holders)
    while kept and holders[kept - 1] != "0" and decimals[kept - 1] == "0":
        kept -= 1
    out, place = [], 0
    for token in tokens:
        if token.kind != "digit":
            out.append(_shown(token))
            continue
        out.append(decimals[place] if place < kept else {"?": " ", "#": ""}[token.text])
        place += 1
    return "".join(out)


def _scientific(d: Decimal, tokens: tuple[Token, ...]) -> tuple[str, bool]:
    e = next(i for i, t in enumerate(tokens) if t.kind == "exponent")
    mantissa, tail = tokens[:e], tokens[e + 1 :]
    whole, fraction, thousands, _ = _laid_out(mantissa)
    step = sum(t.kind == "digit" for t in whole)
    places = sum(t.kind == "digit" for t in fraction or ())
    power = 0
    percents = sum(t.kind == "percent" for t in tokens)
    d = d.scaleb(2 * percents, context=_WIDE)
    if d:
        power = _power(d.adjusted(), step)
        shown = rounded(d.scaleb(-power, context=_WIDE), places)
        if _power(shown.adjusted() + power, step) != power:
            power = _power(shown.adjusted() + power, step)
            shown = rounded(d.scaleb(-power, context=_WIDE), places)
    else:
        shown = rounded(d, places)
    digits, _, decimals = f"{shown:f}".partition(".")
    text = _whole_text(digits.lstrip("0"), whole, thousands, fraction is not None)
    if fraction is not None:
        text += "." + _decimals_text(decimals, fraction)
    sign = "-" if power < 0 else "+" if tokens[e].text[1] == "+" else ""
    holders = list(tail)
    return f"{text}E{sign}{_whole_text(str(abs(power)).lstrip('0'), holders, False, False)}", d != 0


def _power(exponent: int, step: int) -> int:
    """Exponent shown: a multiple of the digits before the point; without any the mantissa is below 1."""
    return exponent // step * step if step else exponent + 1


def _slash_of_fraction(tokens: tuple[Token, ...]) -> int | None:
    for i, t in enumerate(tokens):
        if t.kind == "slash" and 0 < i < len(tokens) - 1 and tokens[i - 1].kind == "digit":
            after = tokens[i + 1]
            if after.kind == "digit" or (after.kind == "literal" and after.text.isdigit()):
                return i
    return None


def _fraction_text(d: Decimal, tokens: tuple[Token, ...]) -> tuple[str, bool]:
    slash = _slash_of_fraction(tokens)
    assert slash is not None
    start = slash
    while start and tokens[start - 1].kind == "digit":
        start -= 1
    end = slash + 1
    while end < len(tokens) and (tokens[end].kind == "digit" or tokens[end].text.isdigit()):
        end += 1
    top, bottom = tokens[start:slash], tokens[slash + 1 : end]
    before, after = list(tokens[:start]), "".join(_shown(t) for t in tokens[end:])
    mixed = any(t.kind == "digit" for t in before)
    percents = sum(t.kind == "percent" for t in tokens)
    value = Fraction(d) * 100**percents
    fixed = "".join(t.text for t in bottom if t.text.isdigit())
    if all(t.kind == "literal" or t.text == "0" for t in bottom) and fixed.strip("0"):
        denominator = int(fixed)
        numerator = int(value * denominator + Fraction(1, 2))
    else:
        fixed = ""
        near = value.limit_denominator(10 ** len(bottom) - 1)
        numerator, denominator = near.numerator, near.denominator
    whole, numerator = divmod(numerator, denominator) if mixed else (0, numerator)
    shown = bool(whole or numerator)
    digits = str(whole).lstrip("0") or ("" if numerator or not mixed else "0")
    head = _whole_text(digits, before, False, False)
    if mixed and numerator == 0 and all(t.text != "0" for t in top):
        width = len(top) + 1 + (len(fixed) or len(bottom))
        blank = width if any(t.text == "?" for t in top) else 0
        return (head + " " * blank if blank else head.rstrip(" ")) + after, shown
    numerator_text = _whole_text(str(numerator), list(top), False, False)
    if fixed:
        denominator_text = fixed
    elif bottom[0].text == "0":
        denominator_text = str(denominator).zfill(len(bottom))
    else:
        denominator_text = str(denominator).ljust(len(bottom)) if bottom[0].text == "?" else str(denominator)
    return f"{head}{numerator_text}/{denominator_text}{after}", shown
