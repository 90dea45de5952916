"""Whether a preamble can be one: asked without setting anything."""

from __future__ import annotations

from benchtool.errors import ReplyError
from benchtool_drivers.dialect.records import Dialect
from benchtool_drivers.dialect.vocabulary import X_FORMS, Y_FORMS
from benchtool_drivers.digitiser.preamble import read_preamble
from benchtool_drivers.digitiser.talk import Speaker, Talk

_ABOVE_ZERO = ("dt", "rate", "span", "time_scale", "codes_per_division", "probe")
_NOT_ZERO = ("inc", "gain", "scale")


def find_nonsense(link: Speaker, dialect: Dialect) -> str:
    """Return what is impossible about the preamble, nothing where it is sound.

    Nothing is set and no record is moved: a descriptor that leads the samples is not looked at.
    """
    preamble = dialect.body.preamble
    if preamble.kind in ("block", "block-text", "dif"):
        return ""
    talk = Talk(link, dialect)
    scale = dialect.body.scale
    needed = (*X_FORMS[scale.x][0], *Y_FORMS[scale.y][0])
    try:
        fields = read_preamble(talk, dialect.channel.names[0])
        if fields is None:
            return ""
        for name in needed:
            if name in _ABOVE_ZERO:
                fields.above_zero(name)
            elif name in _NOT_ZERO:
                fields.other_than_zero(name)
            else:
                fields.number(name)
        if "points" in fields:
            fields.count("points")
    except ReplyError as error:
        return error.message
    return ""
